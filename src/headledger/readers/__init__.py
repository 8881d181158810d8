"""Job folders and logs in, nouns and digests out; no hydraulics here."""
