"""What draws the Saltmere phantom series; run ``make_samples.py`` beside this folder."""
