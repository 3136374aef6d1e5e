"""Finding a way along streets: the network, the best way, other ways, two separate ways, trees."""
