"""The nouns: frozen dataclasses that know no file, page or clock."""
