"""Words and pictures: tables, figures, page, calendar; computes nothing."""
