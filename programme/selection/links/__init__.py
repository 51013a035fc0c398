"""The six links, each judged by a pure function: facts in, a `Link` out."""
