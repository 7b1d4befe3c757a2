"""What a prompt and a notebook show of an adjustment."""

from dataclasses import replace
from html.parser import HTMLParser

import pytest

from adjust.reports.summary import GLANCE
from adjust.reports.verdict import verdict
from tests.adjusted_networks import JOBS, adjusted

VOID = {"br", "hr", "img"}


class Outline(HTMLParser):
    """Text of each element, and whether every tag is closed in its place."""

    def __init__(self):
        super().__init__()
        self.open, self.texts, self.tags = [], [], []

    def handle_starttag(self, tag, attributes):
        self.tags.append(tag)
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        self.texts.append(data)


def outline(adjustment):
    parser = Outline()
    parser.feed(adjustment._repr_html_())
    parser.close()
    assert parser.open == []
    return parser


@pytest.mark.parametrize("name", list(JOBS))
def test_prompt_shows_title_verdict_and_marks(name):
    adjustment = adjusted(name)
    text = repr(adjustment)
    assert text.splitlines()[0] == adjustment.job.title
    assert verdict(adjustment)[:60] in text.replace("\n", " ")
    assert all(mark in text for mark in adjustment.job.marks.names[:GLANCE])


@pytest.mark.parametrize("name", list(JOBS))
def test_notebook_shows_the_same_in_well_formed_html(name):
    adjustment = adjusted(name)
    parser = outline(adjustment)
    assert adjustment.job.title in parser.texts
    assert verdict(adjustment) in parser.texts
    assert set(adjustment.job.marks.names[:GLANCE]) <= set(parser.texts)


def test_text_of_the_job_cannot_become_markup():
    adjustment = adjusted("unchecked")
    marks = replace(adjustment.job.marks, names=("<b>A</b>", "B&C"))
    parser = outline(replace(adjustment, job=replace(adjustment.job, title="<script>x</script>", marks=marks)))
    assert "script" not in parser.tags
    assert "b" not in parser.tags
    assert "<b>A</b>" in parser.texts
    assert "B&C" in parser.texts


def test_many_marks_are_counted_rather_than_shown():
    adjustment = adjusted("levelling")
    assert "more mark" not in repr(adjustment)
    import adjust.reports.summary as summary

    hidden = len(adjustment.job.marks) - 5
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(summary, "GLANCE", 5)
        assert repr(adjustment).endswith(f"and {hidden} more marks")
