"""The map: moving, zooming, figures under the pointer, choice that leads to the tables and back, keys."""

import re

import pytest


def view(found):
    found.settle()
    return [float(part) for part in found.page.locator("#map").get_attribute("viewBox").split()]


def place_of(found, name):
    """Where a mark lies on the screen: its point in the drawing, carried through the picture's transformation."""
    return found.page.evaluate(
        """name => {
            const figures = JSON.parse(document.getElementById("figures").textContent);
            const mark = figures.names.indexOf(name), map = document.getElementById("map");
            const at = ["x", "y"].map(axis => Number(figures.map[axis].text.split(figures.map[axis].by)[mark]) / 100);
            const point = new DOMPoint(...at).matrixTransform(map.getScreenCTM());
            return [point.x, point.y];
        }""",
        name,
    )


def chosen_rows(found, table):
    return found.page.locator(f'table[data-table="{table}"] tr.chosen > th').all_inner_texts()


def test_buttons_zoom_and_return(opened):
    found = opened("town_traverse")
    whole = view(found)
    found.page.click('[data-zoom="in"]')
    nearer = view(found)
    assert nearer[2] == pytest.approx(whole[2] / 1.5, rel=1e-6)
    assert nearer[0] + nearer[2] / 2 == pytest.approx(whole[0] + whole[2] / 2, abs=1e-6)
    found.page.click('[data-zoom="out"]')
    found.page.click('[data-zoom="out"]')
    assert view(found)[2] == pytest.approx(whole[2] * 1.5, rel=1e-6)
    found.page.click('[data-zoom="whole"]')
    assert view(found) == pytest.approx(whole, abs=1e-6)


def test_dragging_moves_the_map_and_chooses_nothing(opened):
    found = opened("town_traverse")
    found.page.locator("#map").scroll_into_view_if_needed()
    before = view(found)
    x, y = place_of(found, "303")
    found.page.mouse.move(x, y)
    found.page.mouse.down()
    found.page.mouse.move(x + 60, y - 40, steps=4)
    found.page.mouse.up()
    after = view(found)
    scale = found.page.locator("#map").bounding_box()["width"] / before[2]
    assert after[0] == pytest.approx(before[0] - 60 / scale, abs=0.1)
    assert after[1] == pytest.approx(before[1] + 40 / scale, abs=0.1)
    assert chosen_rows(found, "marks") == []


def turn_wheel(found):
    found.page.locator("#map").scroll_into_view_if_needed()
    found.page.mouse.move(*place_of(found, "303"))
    found.page.mouse.wheel(0, -200)
    for _ in range(30):  # frames: the wheel's event comes when it comes
        found.settle()


def test_wheel_scrolls_the_page_while_the_map_is_not_in_use(opened):
    found = opened("town_traverse")
    before = view(found)
    turn_wheel(found)
    assert view(found) == before


def test_wheel_zooms_the_map_in_use(opened):
    found = opened("town_traverse")
    before = view(found)
    found.page.focus("#map")
    turn_wheel(found)
    assert view(found)[2] < before[2]


def test_pointer_over_a_mark_shows_its_figures(opened):
    found = opened("town_traverse")
    found.page.locator("#map").scroll_into_view_if_needed()
    found.page.mouse.move(*place_of(found, "303"))
    card = found.page.locator("#card")
    assert card.locator("strong").inner_text() == "303"
    row = found.page.locator(
        'table[data-table="marks"] tr', has=found.page.get_by_role("button", name="303", exact=True)
    )
    for cell in row.locator("td.n").all_inner_texts()[:5]:
        assert cell in card.inner_text()
    found.page.mouse.move(5, 5)
    assert card.is_hidden()


def test_choosing_a_mark_marks_its_rows_in_every_table(opened):
    found = opened("town_traverse")
    found.page.locator("#map").scroll_into_view_if_needed()
    found.page.mouse.click(*place_of(found, "303"))
    found.settle()
    assert chosen_rows(found, "marks") == ["303"]
    for table in ("observations", "relative"):
        rows = chosen_rows(found, table)
        every = found.page.locator(f'table[data-table="{table}"] tbody th').all_inner_texts()
        assert rows == [row for row in every if "303" in re.split(r"[^\w]+", row)]
        assert rows
    assert found.page.locator("[data-halo] path").count() == 1
    assert "303" in found.text("#said")
    found.page.get_by_role("button", name="Only its rows").click()
    assert set(found.page.locator('table[data-table="marks"] tbody th').all_inner_texts()) == {"303"}
    found.page.get_by_role("button", name="Let go").click()
    assert found.page.locator('table[data-table="marks"] tbody tr').count() == 14
    assert chosen_rows(found, "observations") == []


def test_choosing_a_line_draws_its_relative_ellipse(opened):
    found = opened("town_traverse")
    found.page.locator("#map").scroll_into_view_if_needed()
    (x1, y1), (x2, y2) = place_of(found, "302"), place_of(found, "303")
    found.page.mouse.click((x1 + x2) / 2, (y1 + y2) / 2)
    found.settle()
    assert chosen_rows(found, "relative") == ["302 → 303"]
    assert set(chosen_rows(found, "observations")) == {"302 → 303", "303 → 302"}
    assert found.page.locator("[data-relatives] ellipse").count() == 1


def test_choosing_a_row_marks_it_on_the_map(opened):
    found = opened("town_traverse")
    found.page.locator('table[data-table="relative"] button.pick', has_text="302 → 303").click()
    found.settle()
    assert found.page.locator("[data-halo] .way").count() == 1
    assert found.page.locator("[data-halo] .ring").count() == 2
    found.page.locator('table[data-table="relative"] button.pick', has_text="302 → 303").click()
    found.settle()
    assert found.page.locator("[data-halo] path").count() == 0


def test_a_suspect_leads_to_its_line(opened):
    found = opened("town_traverse")
    found.page.locator(".suspects li").first.get_by_role("button").click()
    found.settle()
    assert chosen_rows(found, "relative") == ["302 → 303"]
    assert "chosen" in found.page.locator(".suspects li").first.get_attribute("class")


def test_exaggeration_sizes_ellipses_about_their_marks(opened):
    found = opened("town_traverse")

    def box():
        return found.page.locator(".ellipses path").first.evaluate(
            """each => { const b = each.getBoundingClientRect();
            return [b.x + b.width / 2, b.y + b.height / 2, b.width]; }"""
        )

    def times():
        return float(found.text("#exaggeration-words").split()[0].replace(",", ""))

    x, y, width = box()
    first = times()
    found.page.focus("#exaggeration")
    found.page.keyboard.press("ArrowRight")
    assert times() > first
    ratio = times() / first
    assert box()[2] == pytest.approx(width * ratio, rel=0.12)  # the outline's own width does not grow
    assert box()[:2] == pytest.approx([x, y], abs=0.5)
    assert found.text("#drawn-at") == f"{times():,.0f}"
    found.page.select_option("#probability", "standard")
    assert box()[2] < width * ratio / 2


def test_kinds_can_be_hidden(opened):
    found = opened("dam_control")
    layer = found.page.locator('#map [data-layer="vectors"]')
    assert layer.is_visible()
    found.page.locator('[data-toggle="vectors"]').uncheck()
    assert layer.is_hidden()
    assert found.page.locator('#map [data-layer="distances"]').is_visible()


def test_kinds_differ_in_dash_and_width_not_only_in_colour(opened):
    found = opened("dam_control")
    looks = found.page.locator("#map .line").evaluate_all(
        """lines => lines.map(line => { const style = getComputedStyle(line);
        return style.strokeDasharray + style.strokeWidth; })"""
    )
    assert len(looks) == len(set(looks)) >= 5


def test_labels_do_not_overlap_and_grow_in_number_as_one_comes_nearer(opened):
    found = opened("total station")

    def boxes():
        found.settle()
        return found.page.locator("[data-labels] text").evaluate_all(
            """texts => texts.map(text => { const b = text.getBoundingClientRect();
            return [b.left, b.top, b.right, b.bottom]; })"""
        )

    shown = boxes()
    assert shown
    for place, (left, top, right, bottom) in enumerate(shown):
        for other in shown[:place]:
            # px: a line of text is taller than its letters
            assert right <= other[0] + 3 or other[2] <= left + 3 or bottom <= other[1] + 4 or other[3] <= top + 4


def test_keyboard_walks_moves_and_lets_go(opened):
    found = opened("town_traverse")
    found.page.focus("#map")
    found.page.keyboard.press("n")
    found.settle()
    assert chosen_rows(found, "marks") == ["201"]
    found.page.keyboard.press("n")
    found.settle()
    assert chosen_rows(found, "marks") == ["202"]
    assert found.text("#said").startswith("202: plan adjusted")
    found.page.keyboard.press("p")
    found.page.keyboard.press("Enter")
    found.settle()
    assert found.page.locator('table[data-table="marks"] tbody th').all_inner_texts() == ["201"]
    before = view(found)
    found.page.keyboard.press("+")
    found.page.keyboard.press("ArrowRight")
    assert view(found)[2] < before[2]
    found.page.keyboard.press("0")
    assert view(found) == pytest.approx(before, abs=1e-6)
    found.page.keyboard.press("Escape")
    found.settle()
    assert found.page.locator('table[data-table="marks"] tbody tr').count() == 14


def test_finding_a_mark_by_its_name(opened):
    found = opened("town_traverse")
    found.page.fill("#find-mark", "304")
    found.page.keyboard.press("Enter")
    found.settle()
    assert chosen_rows(found, "marks") == ["304"]
    x, _ = place_of(found, "304")
    box = found.page.locator("#map").bounding_box()
    assert x == pytest.approx(box["x"] + box["width"] / 2, abs=2)


def test_levels_have_a_schematic(opened):
    found = opened("fen_levels")
    assert found.text("#map-title") == "Schematic"
    assert "not where anything lies" in found.page.inner_text("main")
    assert found.page.locator(".bars .sized").count() == 6
    assert found.page.locator("[data-furniture] *").count() == 0
    assert sorted(found.page.locator("[data-labels] text").all_text_contents()) == [
        "BM17",
        "BM23",
        *(f"F{n}" for n in range(1, 7)),
    ]


def test_scale_bar_is_as_long_as_it_says(opened):
    found = opened("town_traverse")
    width = found.page.locator("[data-furniture] path").first.evaluate("each => each.getBBox().width")
    words = found.page.locator("[data-furniture] text").first.text_content()
    metres = float(words.split()[0]) * {"km": 1000, "m": 1}[words.split()[1]]
    (x1, y1), (x2, y2) = place_of(found, "K101"), place_of(found, "K102")
    scale = found.page.locator("#map").bounding_box()["width"] / view(found)[2]
    on_screen = ((x2 - x1) ** 2 + (y2 - y1) ** 2) ** 0.5 / scale
    east, north = found.page.evaluate(
        """() => { const rows = [...document.querySelectorAll('table[data-table="marks"] tbody tr')];
        const of = name => rows.find(row => row.cells[0].textContent === name);
        const at = (name, cell) => Number(of(name).cells[cell].textContent);
        return [at("K101", 3) - at("K102", 3), at("K101", 4) - at("K102", 4)]; }"""
    )
    assert metres / width == pytest.approx((east**2 + north**2) ** 0.5 / on_screen, rel=1e-3)
