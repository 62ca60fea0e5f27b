"""Questions with answers: each study asks the store and returns plain values, ready for JSON."""
