class Desk:
    def __init__(self, result):
        from unitclass.tui.renderables.queue_rows import QueueEntry
        self.units=[(c,u) for c,u in result.units()]
        self.entries=[QueueEntry(u.unit,u.suggestion.type) for c,u in self.units]
        self.here=0
    def view(self):
        from unitclass.tui.renderables.verdict import Verdict
        from unitclass.tui.widgets.panels import UnitView
        c,u=self.units[self.here]; s=u.suggestion
        return UnitView(u,c.nerve_profiles,1,2,s.type,Verdict(s.type,s.probability,s.ranked,reasons=s.reasons,flags=u.flags,rule="rule of thumb: "+s.rule_type, fit="differs most from x at phase 0.3: 30 spikes/s, fitted 40"))
    def head(self):
        c,u=self.units[self.here]
        return f"unit {u.unit} {u.condition}","rig/heron.nwb",f"{self.here+1} of {len(self.units)}"
    def go(self,p): self.here=min(max(p,0),len(self.entries)-1)
    def accept(self): self.go(self.here+1); return "accepted"
