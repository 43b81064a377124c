"""From a file of any form to one rectangular table of text: unpacked, decoded, cut, headed."""
