"""The boundary layer and wake of a section, solved together with the potential flow."""
