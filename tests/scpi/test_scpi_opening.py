"""Opening: libraries and resources that are not there."""

from __future__ import annotations

import pytest
import pyvisa

from benchrun.clock import SystemClock
from benchrun.errors import ResourceNotFound
from benchrun.scpi.opening import open_manager, open_session
from benchrun.scpi.transcript import Transcript


@pytest.mark.parametrize("library", ["@nobody", "no-such-folder/libvisa.so"])
def test_an_unknown_library_is_told(library):
    with pytest.raises(
        ResourceNotFound, match=f"there is no VISA library {library} on this machine"
    ) as caught:
        open_manager(library)
    assert 'write library: "@py"' in str(caught.value)


@pytest.mark.parametrize("resource", ["", "nonsense", "TCPIP::::SOCKET"])
def test_an_unknown_resource_is_told(py_manager, resource):
    with pytest.raises(ResourceNotFound) as caught:
        open_session(py_manager, resource, SystemClock(), Transcript())
    assert caught.value.resource == resource
    assert "\n" not in str(caught.value)


class _Line:
    def __init__(self):
        self.closed = False

    def close(self):
        self.closed = True


class _Manager:
    def __init__(self, line):
        self.line = line

    def open_resource(self, name, open_timeout):
        if isinstance(self.line, Exception):
            raise self.line
        return self.line


def test_what_takes_no_messages_is_closed_again():
    line = _Line()
    with pytest.raises(ResourceNotFound, match="no instrument that takes messages"):
        open_session(_Manager(line), "PXI0::1::INSTR", SystemClock(), Transcript())  # type: ignore[arg-type]
    assert line.closed


@pytest.mark.parametrize(
    "error",
    [
        Exception("could not connect: [Errno -2] Name or service not known"),
        ValueError("bad\nmore"),
        KeyError(),
        pyvisa.errors.VisaIOError(pyvisa.constants.StatusCode.error_resource_not_found),
    ],
)
def test_whatever_opening_raises_is_a_resource_not_found(error):
    with pytest.raises(ResourceNotFound, match="check the resource name in the bench file"):
        open_session(_Manager(error), "GPIB0::3::INSTR", SystemClock(), Transcript())  # type: ignore[arg-type]
