"""A gapped post of finite permeability between ideal plates, linear and saturating."""
