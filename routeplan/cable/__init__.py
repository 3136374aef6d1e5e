"""What is ordered and joined: slack, rulers, reels and joints, fibres, colours, schedule."""
