"""Api: routes, request and response shapes, problem+json. Knows no SQL."""
