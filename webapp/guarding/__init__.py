"""What keeps the service standing: bounds on what is asked and kept, busy answers, log, health, stopping."""
