"""What the job is done with. Siblings behind one protocol: simulated, recording, portaudio."""
