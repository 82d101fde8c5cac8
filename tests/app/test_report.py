"""The report: one file with everything in it and nothing from outside."""

import re
from html.parser import HTMLParser

import pytest
from jobs import write_case

from ductsolve.app import job, writing
from ductsolve.app.markup import escaped, table_html
from ductsolve.app.report import report
from ductsolve.app.summary import Row, summary


class Page(HTMLParser):
    """Tags, their attributes and the text of a page, with every tag closed in its turn."""

    VOID = {"meta", "img", "br"}

    def __init__(self, text):
        super().__init__()
        self.tags, self.words, self.open = [], [], []
        self.feed(text)
        assert not self.open

    def handle_starttag(self, tag, attributes):
        self.tags.append((tag, dict(attributes)))
        if tag not in self.VOID:
            self.open.append(tag)

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        if self.open and self.open[-1] != "style":
            self.words.append(data)

    @property
    def text(self):
        return " ".join("".join(self.words).split())


@pytest.fixture(scope="module")
def outcomes(tmp_path_factory):
    folder = tmp_path_factory.mktemp("cases")
    return lambda name, cache={}: cache.setdefault(name, job.run(write_case(folder, name)))


@pytest.fixture(scope="module")
def channel(outcomes):
    return report(outcomes("channel"), writing.draw(outcomes("channel")))


def test_nothing_comes_from_outside(channel):
    page = Page(channel)
    assert not {"script", "link", "iframe", "object"} & {tag for tag, _ in page.tags}
    sources = [value for _, attributes in page.tags for name, value in attributes.items() if name == "src"]
    assert len(sources) == 3
    assert all(source.startswith("data:image/") for source in sources)
    assert "url(" not in channel and "@import" not in channel and "http" not in channel


def test_pictures_have_words(channel):
    alts = [attributes["alt"] for tag, attributes in Page(channel).tags if tag == "img"]
    assert len(set(alts)) == 3 and all(len(alt) > 30 for alt in alts)


def test_titles_are_escaped(channel):
    assert "<title>Slurry &lt;channel&gt; &amp; sons</title>" in channel
    assert "Slurry <channel> & sons" in Page(channel).text


def test_every_row_and_sentence_of_the_summary_is_there(outcomes, channel):
    text = Page(channel).text
    for block in summary(outcomes("channel")):
        for part in [cell for row in block.rows for cell in row.cells] + list(block.notes):
            assert " ".join(Page(f"<p>{escaped(part)}</p>").text.split()) in text


def test_the_bracket_closing_in(outcomes, channel):
    history = outcomes("channel").flow.history
    assert len(re.findall(r">level \d+<", channel)) == len(history)


def test_the_points_of_a_flow_curve(outcomes, channel):
    text = Page(report(outcomes("fast"), {})).text
    assert re.search(r"point 1\s*1 1/s\s*0.01 Pa\s*point 2\s*3 1/s\s*0.03 Pa\s*point 3\s*10 1/s", text)
    assert "Flow curve" not in channel


def test_warnings_stand_out(outcomes, channel):
    fast = report(outcomes("fast"), {})
    assert fast.index('<section class="warnings">') < fast.index("<h2>Answer")
    assert 'class="warnings"' not in channel


def test_without_pictures_or_flow(outcomes):
    page = Page(report(outcomes("stuck"), {}))
    assert "img" not in {tag for tag, _ in page.tags}
    assert "no flow, proved" in page.text


def test_powers_are_raised():
    assert escaped("m^3/s") == "m<sup>3</sup>/s"
    assert escaped("8^(n-1) K") == "8<sup>n-1</sup> K"
    raised = "(n + 2)<sup>(n + 2)/(n + 1)</sup> / (3n + 1)<sup>2</sup>"
    assert escaped("(n + 2)^((n + 2)/(n + 1)) / (3n + 1)^2") == raised
    assert escaped("(3n + 1)^2.") == "(3n + 1)<sup>2</sup>."
    assert escaped("Pa.s^0.55 <b>") == "Pa.s<sup>0.55</sup> &lt;b&gt;"


def test_short_rows_fill_the_width():
    table = table_html([Row("a", ("1", "2", "3")), Row("  b", ("4",)), Row("c", ())])
    assert '<tr class="part"><th scope="row">b</th><td colspan="3">4</td></tr>' in table
    assert '<th scope="row">c</th><td colspan="3"></td>' in table
    assert table_html([]) == ""
