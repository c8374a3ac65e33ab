"""The certificate as a digital calibration certificate (DCC) in XML."""
