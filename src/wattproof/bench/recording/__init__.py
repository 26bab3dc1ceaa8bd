"""Recordings: a sound file opened with care, and one played as if it were live."""

from wattproof.bench.recording.bench import RecordingBench
from wattproof.bench.recording.sound_file import SoundFileContent, open_sound

__all__ = ["RecordingBench", "SoundFileContent", "open_sound"]
