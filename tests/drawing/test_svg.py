"""SVG text: escaped everywhere, well-formed, named for screen readers, no style attributes."""

from xml.etree import ElementTree as ET

from server.drawing.svg import element, picture, words

SVG = "{http://www.w3.org/2000/svg}"


def test_element_attribute_with_quotes_is_escaped() -> None:
    assert element("g", {"class": 'a" onload="x'}) == '<g class="a&quot; onload=&quot;x"/>'


def test_words_markup_is_shown_as_text() -> None:
    read = ET.fromstring(words("<script>1</script>", 1, 2))
    assert read.text == "<script>1</script>"
    assert len(read) == 0


def test_picture_says_stands_in_label_and_title() -> None:
    read = ET.fromstring(picture(10, 20, says="a < b", parts=[], kind="dots"))
    assert read.get("role") == "img"
    assert read.get("aria-label") == "a < b"
    assert read.find(f"{SVG}title").text == "a < b"
    assert read.get("viewBox") == "0 0 10 20"


def test_element_number_is_written_to_a_hundredth_of_a_pixel() -> None:
    assert element("i", {"x": 1 / 3, "y": 2.0, "z": 5}) == '<i x="0.33" y="2" z="5"/>'
