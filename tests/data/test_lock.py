"""Only one process may publish."""

from __future__ import annotations

import pytest

from setdrift.data.lock import only_publisher
from setdrift.errors import SetdriftError


def test_second_publisher_is_refused_while_the_first_writes(tmp_path):
    with only_publisher(tmp_path), pytest.raises(SetdriftError, match="another run"), only_publisher(tmp_path):
        pass


def test_lock_is_free_again_after_a_failure(tmp_path):
    with pytest.raises(RuntimeError), only_publisher(tmp_path):
        raise RuntimeError
    with only_publisher(tmp_path):
        pass
