"""The instruments' side of IEEE 488.2 and SCPI-1999: messages, command trees, status, error queue."""
