"""Every page on a phone. A file of its own, since those of one file take turns."""

import pytest

from tests.browser.conftest import Enter
from tests.browser.order import FITS, in_order
from tests.browser.site import Site
from tests.browser.tour import READ


@pytest.mark.parametrize("name", READ)
def test_a_page_is_in_order_on_a_narrow_screen_and_reflows_at_320_pixels(
    demo_site: Site, visit: Enter, name: str
) -> None:
    page = in_order(visit(demo_site, size="narrow"), READ[name])
    page.set_viewport_size({"width": 320, "height": 700})
    page.wait_for_function(FITS)  # charts are drawn anew
