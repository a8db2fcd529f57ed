"""What several tests share: reference data, slow oracles, sizes of sweeps."""
