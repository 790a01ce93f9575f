"""Problems with known answers, solved at a sequence of levels: observed against expected orders and errors."""
