import itertools

import pytest
from django.template import loader
from django.template.engine import Engine

from programme import figures
from programme.drawing.chain import (
    BROKEN,
    CELL,
    DROP,
    MINI_H,
    MINI_W,
    chain_links,
    chain_size,
    mini_bars,
)

STATES = ("holds", "due soon", "broken")
EVERY = list(itertools.product(STATES, repeat=6))


def boxes(drawn):
    """The box of each link's own loop, its joiner left out."""
    return [
        (
            min(s.box[0] for s in link.strokes[: 2 if link.state == BROKEN else 1]),
            max(s.box[2] for s in link.strokes[: 2 if link.state == BROKEN else 1]),
        )
        for link in drawn
    ]


def test_no_loop_of_any_of_the_729_patterns_touches_the_next():
    for states in EVERY:
        loops = boxes(chain_links(states))
        assert all(left[1] < right[0] for left, right in itertools.pairwise(loops)), states


def test_every_pattern_stays_within_its_drawing():
    for states in EVERY:
        width, height = chain_size(states)
        for link in chain_links(states):
            for stroke in link.strokes:
                left, top, right, bottom = stroke.box
                assert left >= 0, states
                assert top >= 0, states
                assert right <= width + CELL / 10, states
                assert bottom <= height, states


def test_a_chain_that_holds_lies_level():
    tops = {round(link.strokes[0].box[1], 3) for link in chain_links(["holds"] * 6)}
    assert len(tops) == 1


def test_everything_after_the_first_break_hangs_lower_and_thinner():
    drawn = chain_links(["holds", "holds", "broken", "holds", "broken", "holds"])
    assert drawn[3].strokes[0].box[1] - drawn[1].strokes[0].box[1] == pytest.approx(DROP, abs=3)
    assert drawn[3].strokes[0].width < drawn[1].strokes[0].width


def test_a_link_due_soon_differs_in_shape_from_one_that_holds():
    holds, soon = chain_links(["holds", "due soon"])
    assert len(soon.strokes[0].steps) > len(holds.strokes[0].steps)


def test_an_unknown_state_is_refused():
    with pytest.raises(ValueError, match=r"^states: 'fine' is not allowed"):
        chain_links(["fine"])


def test_the_small_chain_fits_its_list():
    for states in EVERY:
        bars = mini_bars(states)
        assert all(bar.x >= 0 and bar.x + bar.width <= MINI_W for bar in bars)
        assert all(bar.y >= 0 and bar.y + 5.5 <= MINI_H for bar in bars)


@pytest.mark.parametrize(
    ("value", "up", "down"),
    [
        (99.994, "100", "99.9"),
        (0.04999, "0.05", "0.0499"),
        (799.9999999999999, "800", "800"),
        (0.30000000000000004, "0.3", "0.3"),
        (10000.0, "10\u202f000", "10\u202f000"),
        (None, "not known", "not known"),
        (float("nan"), "not known", "not known"),
        (0.0, "0", "0"),
    ],
    ids=str,
)
def test_rounding_never_crosses_a_limit(value, up, down):
    assert figures.up(value) == up
    assert figures.down(value) == down


def test_a_direction_of_rounding_that_is_none_is_refused():
    with pytest.raises(ValueError, match=r"^toward: 'sideways' is not allowed"):
        figures.rounded(1.0, toward="sideways")


def test_every_template_of_the_house_parses():
    from django.conf import settings

    for path in (settings.BASE_DIR / "templates").rglob("*.html"):
        loader.get_template(str(path.relative_to(settings.BASE_DIR / "templates")))
    assert Engine.get_default()


def luminance(colour):
    parts = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one, other):
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


@pytest.mark.parametrize(
    ("ink", "least"),
    [("#1d2a33", 7), ("#4a5860", 4.5), ("#0b5563", 4.5)],
    ids=["ink", "soft", "link"],
)
@pytest.mark.parametrize("paper", ["#fbfaf6", "#ffffff"])
def test_text_stands_out_from_its_paper(ink, least, paper):
    """WCAG 2.2, 1.4.3: contrast of text at least 4.5:1 (verified); its formula from 1.4.3."""
    from django.conf import settings

    css = (settings.BASE_DIR / "static" / "css" / "house.css").read_text()
    assert ink in css
    assert contrast(ink, paper) >= least
