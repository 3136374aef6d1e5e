"""Where a run goes: lines joined into nodes and legs, lengths, stations."""
