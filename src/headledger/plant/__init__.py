"""The nouns of a job: frozen dataclasses that know their own consistency."""
