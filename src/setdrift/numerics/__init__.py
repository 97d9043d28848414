"""Array mathematics: numpy in, numpy out; nothing here knows files, labels or configuration."""
