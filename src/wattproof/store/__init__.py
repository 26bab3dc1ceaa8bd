"""The session file and the records of rig and calibration."""
