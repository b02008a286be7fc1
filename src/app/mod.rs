//! What a person runs: arguments, prompt, batch, files, interrupts. The only folder that touches the outside world.
