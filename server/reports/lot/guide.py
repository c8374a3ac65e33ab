"""The guide inside a lot's archive: what lies where, and how to check it without this program."""

from server.reports.lot.bundle import LotBundle

_GUIDE = """\
Lot {code}: {name}
{laboratory}
State of everything here: {as_of}

What lies where
  lot.json                              the lot, its certificates with their states, bottles, files
  certificates/NUMBER.pdf               the certificate for reading; NUMBER.json and .jws inside
  certificates/NUMBER.json              the issued document; its SHA-256 is the document's digest
  certificates/NUMBER.jws               the same, signed by the laboratory (RFC 7515, ES256)
  certificates/NUMBER.bench-record.json what the number was computed from
  certificates/NUMBER.evaluation.json   record, constants and result, as the signatures bind them
{dcc}  entries.csv                           all that was written, also what was struck through
  trail.jsonl                           who did what to this lot and when, a row of the trail a line
  keys.json                             the laboratory's public keys (RFC 7517), retired ones too
  files/                                original papers and curves, as they were brought in
  manifest.json, SHA256SUMS             the hash of every file

How to check it
  Every file:          sha256sum -c SHA256SUMS
  A signature:         any JOSE library, with NUMBER.jws and keys.json
  A number:            python -m server evaluate certificates/NUMBER.bench-record.json
                       (with --monte-carlo and --seed as trials and seed in NUMBER.evaluation.json
                       say, where the certificate prints a Monte Carlo interval)
  A row of the trail:  its hash is the SHA-256 of previous_hash, a line feed, and the row without
                       previous_hash and hash as JSON with sorted keys and without spaces. Rows of
                       other lots lie between these; the whole chain is checked by the laboratory.

entries.csv was made for spreadsheets: a cell that a spreadsheet might run has an apostrophe before
it. What a certificate is worth today, its state, is asked of the laboratory.
"""
_DCC = """\
  certificates/NUMBER.dcc.xml           the same as a digital calibration certificate (DCC 3.3.0)
"""
_NO_DCC = """\
  (no DCC: the laboratory's country is not set)
"""


def guide_text(bundle: LotBundle, *, with_dcc: bool) -> str:
    """Return the guide to a lot's archive."""
    return _GUIDE.format(
        code=bundle.code,
        name=bundle.name,
        laboratory=bundle.laboratory,
        as_of=bundle.as_of.isoformat(),
        dcc=_DCC if with_dcc else _NO_DCC,
    )
