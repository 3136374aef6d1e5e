"""Plan outside-plant singlemode fibre runs: lengths, reels, joints, fibres, light."""
