"""Files: NWB in and out, tables, template and settings files, the decisions store."""
