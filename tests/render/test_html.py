"""Text stays text, data cannot leave its element, and a page allows only its own scripts."""

import base64
import hashlib
import html
import json
import re
from html.parser import HTMLParser

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.render.html import (
    CARE_NOTICE,
    care_notice,
    clean,
    document,
    escape,
    isolate,
    json_element,
    policy,
    source_hash,
)

ANY_TEXT = st.text(st.characters(exclude_categories=()), max_size=60)
HOSTILE = [
    "<img src=x onerror=alert(1)>",
    "</script><script>alert(1)</script>",
    "<!--",
    "]]>",
    "\u2028\u2029",
    "\ud800",
]


class Reader(HTMLParser):
    """Collects the tags of a page and the text of each script."""

    def __init__(self):
        super().__init__(convert_charrefs=True)
        self.tags, self.scripts, self.text = [], [], ""

    def handle_starttag(self, tag, attrs):
        self.tags.append(tag)
        if tag == "script":
            self.scripts.append("")

    def handle_data(self, data):
        if self.tags and self.tags[-1] == "script":
            self.scripts[-1] += data
        else:
            self.text += data


@given(ANY_TEXT)
def test_escaped_text_reads_back_as_the_clean_text(text):
    assert html.unescape(escape(text)) == clean(text)
    assert not set(escape(text)) & set("<>\"'")
    clean(text).encode()  # and it can be written


@pytest.mark.parametrize("text", HOSTILE)
def test_an_isolated_name_is_one_element_with_text(text):
    reader = Reader()
    reader.feed(isolate(text))
    assert reader.tags == ["bdi"]
    assert reader.text == clean(text)


@given(
    st.recursive(ANY_TEXT | st.integers(), lambda inner: st.lists(inner) | st.dictionaries(ANY_TEXT, inner))
)
def test_data_reads_back_and_cannot_close_its_element(value):
    element = json_element("data", value)
    reader = Reader()
    reader.feed(element)
    assert reader.tags == ["script"]
    assert json.loads(reader.scripts[0]) == value
    assert element.isascii()


def test_the_policy_names_each_script_by_its_hash_and_fetches_nothing():
    digest = base64.b64encode(hashlib.sha256(b"let a = 1;").digest()).decode()
    assert source_hash("let a = 1;") == f"'sha256-{digest}'"
    assert policy(["let a = 1;"], []) == (
        f"default-src 'none'; script-src 'sha256-{digest}'; style-src 'none'; base-uri 'none'; "
        "form-action 'none'"
    )
    assert "style-src 'unsafe-inline'" in policy([], None)


def test_a_document_hashes_what_the_browser_will_read():
    page = document(title="a <b>", style="p{}", body=care_notice(), scripts=["let a;\r\nlet b;"])
    assert source_hash("let a;\nlet b;") in page
    assert "<title>a &lt;b&gt;</title>" in page
    assert CARE_NOTICE in page
    assert "http" not in page.replace("http-equiv", "")


@pytest.mark.parametrize("code", ["'</ScRipt>'", "'</style>'", "// <!-- here"])
def test_a_script_that_would_end_its_element_is_refused(code):
    found = re.search(r"</\w+|<!--", code)[0]
    with pytest.raises(ValueError, match=re.escape(f"a script or style holds {found!r}, which would end")):
        document(title="", style="", body="", scripts=[code])
