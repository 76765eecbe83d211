"""The manual's pictures are made by the program, without deciding anything."""

from tests.tui.apps import app_on, labels, result_of, session_in
from unitclass.tui.pictures import SCREENS, save_pictures


def test_every_screen_becomes_a_picture_and_nothing_is_decided(tmp_path):
    session = session_in(tmp_path, result_of(8, conditions=("baseline", "hypercapnia")))
    files = save_pictures(app_on(session), tmp_path / "pictures", size=(90, 26))
    assert [file.stem for file in files] == list(SCREENS)
    texts = {file.stem: file.read_text("utf-8").replace("&#160;", " ") for file in files}
    assert all(text.startswith("<svg") for text in texts.values())
    for name, words in {"review": "suggested:", "population": "population", "cycles": "cycles used",
                        "end": "end of the review", "help": "keys of: review", "type": "Esc"}.items():
        assert words in texts[name]
    assert labels(session) == {}
