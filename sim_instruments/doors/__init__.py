"""Ways into a world: a VISA library object, a TCP socket."""
