"""The lines with which anyone checks a record by openssl and the usual line tools, without benchrun.

They need openssl 3.0 or later (``pkeyutl -rawin`` with Ed25519) and a POSIX shell. The README shows the same
text, and a test runs it.
"""

from __future__ import annotations

__all__ = ["LINES"]

LINES = r"""
cd "$RECORD"
work=$(mktemp -d)
part() { sed -n 's/.*"'"$1"'": *"\([^"]*\)".*/\1/p' envelope.json; }
part payload | openssl base64 -d -A > "$work/statement"
part sig | openssl base64 -d -A > "$work/sig"
size=$(wc -c < "$work/statement")
{ printf 'DSSEv1 28 application/vnd.in-toto+json %d ' "$size"; cat "$work/statement"; } > "$work/signed"
openssl pkeyutl -verify -pubin -inkey public-key.pem -rawin -in "$work/signed" -sigfile "$work/sig"
openssl pkey -pubin -in public-key.pem -outform DER | openssl dgst -sha256 -r
sed -n 's/^  {"name": "\(.*\)", "digest": {"sha256": "\(.*\)"}},*$/\2 *\1/p' "$work/statement" > "$work/files"
cut -d'*' -f2 "$work/files" | xargs openssl dgst -sha256 -r | diff "$work/files" - && echo "All files fit"
""".lstrip()
"""Shell lines; ``RECORD`` is the record's folder.

They print "Signature Verified Successfully", the key's id (to be compared with the one known from elsewhere:
``benchrun keys list`` at the bench that signed), and "All files fit"."""
