"""Who the people of a service are: signing in, roles, signing off a plan. Nothing of it runs unless set."""
