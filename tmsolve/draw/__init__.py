"""Random configurations: exact samples of finite and infinite chains, and dynamic simulations to lay beside them."""
