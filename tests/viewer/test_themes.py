"""Themes: contrast, colours that stay apart, a lamp that lights only red.

The contrast ratio is that of WCAG 2.2 (section 1.4.3: 4.5:1 for text; 1.4.11: 3:1 for graphics that carry meaning).
"""

import itertools

import pytest

from colure_viewer import strokes, themes
from colure_viewer.themes import LINE, PALETTE, TEXT, TEXT_ROLES, THEMES, channels, contrast, legible, luminance, mix


def test_contrast_of_published_pairs():
    # WCAG 2.2, definition of contrast ratio: black on white is 21:1, a colour on itself 1:1.
    assert contrast("#000000", "#FFFFFF") == pytest.approx(21.0)
    assert contrast("#777777", "#777777") == 1.0
    # Relative luminance of the sRGB primaries are the coefficients of the definition.
    assert [luminance(c) for c in ("#FF0000", "#00FF00", "#0000FF")] == pytest.approx([0.2126, 0.7152, 0.0722])


@pytest.mark.parametrize("theme", THEMES.values(), ids=lambda t: t.name)
@pytest.mark.parametrize("role", TEXT_ROLES)
def test_text_stands_out(theme, role):
    grounds = ["paper", "sky", "milkyway.1", "milkyway.5"]
    for ground in grounds:
        assert contrast(theme.colour(role), theme.colour(ground)) >= TEXT, ground
    # The belt is laid over the sky half transparent; its full colour is the worst case.
    assert contrast(theme.colour(role), mix(theme.colour("sky"), theme.colour("belt"), 1.0)) >= TEXT


@pytest.mark.parametrize("theme", THEMES.values(), ids=lambda t: t.name)
@pytest.mark.parametrize("role", ["ink", "muted", "fault", "accent"])
def test_text_of_the_window_stands_out(theme, role):
    for ground in ("window", "panel", "field"):
        assert contrast(theme.colour(role), theme.colour(ground)) >= TEXT, ground
    assert contrast(theme.colour("on.accent"), theme.colour("accent")) >= TEXT


@pytest.mark.parametrize("theme", THEMES.values(), ids=lambda t: t.name)
@pytest.mark.parametrize("name", PALETTE)
def test_circle_colours_are_legible_in_every_theme(theme, name):
    own = PALETTE[name]
    assert contrast(theme.line("circle", own), theme.colour("sky")) >= LINE
    assert contrast(theme.text("label.circle", own), theme.colour("sky")) >= TEXT


@pytest.mark.parametrize("theme", THEMES.values(), ids=lambda t: t.name)
def test_any_colour_a_user_can_choose_is_legible(theme):
    for own in ("#FFFFFF", "#000000", "#F8F4EA", "#10141A", "#808080", "#FF00FF"):
        assert contrast(theme.text("label.circle", own), theme.colour("sky")) >= TEXT


def test_palette_colours_stay_apart():
    # Two circles are told apart by colour alone at worst: no two of the palette may fall together on paper or slate.
    for theme in (themes.PAPER, themes.SLATE):
        drawn = [channels(theme.line("circle", own)) for own in PALETTE.values()]
        for a, b in itertools.combinations(drawn, 2):
            assert sum((x - y) ** 2 for x, y in zip(a, b, strict=True)) ** 0.5 > 40.0


def test_lamp_lights_only_red():
    for colour in (*themes.LAMP.roles.values(), *themes.LAMP.tints, themes.LAMP.line("circle", "#00FF88")):
        assert channels(colour)[1:] == (0, 0), colour


def test_legible_keeps_what_is_legible_already():
    assert legible("#0072B2", "#FFFFFF", 4.5) == "#0072B2"
    assert luminance(legible("#F0E442", "#FFFFFF", 4.5)) < luminance("#F0E442")


def test_roles_fall_back_by_their_grades():
    theme = themes.PAPER
    assert theme.colour("label.star.minor") == theme.colour("label")
    assert theme.colour("no such role") == theme.colour("ink")


def test_three_weights_and_no_more():
    thick = strokes.THICKNESS
    assert sorted(thick) == [1, 2, 3]
    assert thick[1] < thick[2] < thick[3]


def test_unknown_theme_names_the_known():
    with pytest.raises(ValueError, match="paper, slate, lamp"):
        themes.theme("night")
