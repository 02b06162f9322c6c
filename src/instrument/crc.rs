//! The check sum of Modbus frames on serial lines.

/// CRC-16 of a frame without its check sum: polynomial 0xA001 reflected, begun with 0xFFFF; sent low byte first
/// (MODBUS over Serial Line V1.02, 6.2.2).
#[must_use]
pub fn crc16(frame: &[u8]) -> u16 {
    frame.iter().fold(0xFFFF, |crc, byte| {
        (0..8)
            .fold(crc ^ u16::from(*byte), |crc, _| if crc & 1 == 0 { crc >> 1 } else { (crc >> 1) ^ 0xA001 })
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_worked_example_of_the_specification() {
        // MODBUS over Serial Line V1.02, 6.2.2, "Calculation of the CRC": the frame 02 07 has the CRC 1241 hexadecimal.
        assert_eq!(crc16(&[0x02, 0x07]), 0x1241);
    }
}
