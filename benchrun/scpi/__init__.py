"""IEEE 488.2 and SCPI messages over one PyVISA resource; knows no kind of instrument."""
