"""What is played: tone, tone pair, log sweep, burst, silence, ramps. Pure: numbers in, samples out."""
