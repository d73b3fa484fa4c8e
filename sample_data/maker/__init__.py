"""What make_sample_data.py builds an invented place from."""
