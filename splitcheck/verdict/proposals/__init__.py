"""What would mend a finding: each kind of mend in a module, valued by the road itself."""
