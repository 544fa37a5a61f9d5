"""A table through a pipe while the keys come from the terminal."""


def test_the_screen_works_on_a_table_from_a_pipe(terminal, tmp_path):
    text = "caller,callee,calls\n" + "".join(f"n{i},n{i % 7},{i + 1}\n" for i in range(40))
    (tmp_path / "calls.csv").write_text(text)
    run = terminal("-", piped=tmp_path / "calls.csv")
    run.shows("standard input", "40 nodes", "along caller -> callee", "? all keys")
    run.press("?")
    run.shows("keys and signs")
    run.press("escape")
    run.shows("Enter node")
    run.press("q")
    assert run.ends() == 0
    assert all(run.left_clean().values())


def test_a_pipe_that_brings_nothing_is_one_sentence(terminal, tmp_path):
    (tmp_path / "nothing").write_bytes(b"")
    run = terminal("-", piped=tmp_path / "nothing")
    assert run.ends() == 2
    assert "standard input is empty" in run.text
    assert "Traceback" not in run.text
