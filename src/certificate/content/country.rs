//! Countries by their two letters.

/// Officially assigned two-letter codes of ISO 3166-1:2020 (from memory; the Schematron rules of the certificate schema
/// hold the same list).
const CODES: &str = "AD AE AF AG AI AL AM AO AQ AR AS AT AU AW AX AZ BA BB BD BE BF BG BH BI BJ BL BM BN BO BQ BR BS BT BV \
    BW BY BZ CA CC CD CF CG CH CI CK CL CM CN CO CR CU CV CW CX CY CZ DE DJ DK DM DO DZ EC EE EG EH ER ES ET FI FJ FK FM FO \
    FR GA GB GD GE GF GG GH GI GL GM GN GP GQ GR GS GT GU GW GY HK HM HN HR HT HU ID IE IL IM IN IO IQ IR IS IT JE JM JO JP \
    KE KG KH KI KM KN KP KR KW KY KZ LA LB LC LI LK LR LS LT LU LV LY MA MC MD ME MF MG MH MK ML MM MN MO MP MQ MR MS MT MU \
    MV MW MX MY MZ NA NC NE NF NG NI NL NO NP NR NU NZ OM PA PE PF PG PH PK PL PM PN PR PS PT PW PY QA RE RO RS RU RW SA SB \
    SC SD SE SG SH SI SJ SK SL SM SN SO SR SS ST SV SX SY SZ TC TD TF TG TH TJ TK TL TM TN TO TR TT TV TW TZ UA UG UM US UY \
    UZ VA VC VE VG VI VN VU WF WS YE YT ZA ZM ZW";

/// Whether a text is the code of a country.
#[must_use]
pub fn is_country(text: &str) -> bool {
    text.len() == 2 && CODES.split(' ').any(|code| code == text)
}

/// The country of an address whose last line is its code; nothing is guessed from names.
#[must_use]
pub fn country_of(address: &str) -> Option<&str> {
    address.lines().map(str::trim).rfind(|line| !line.is_empty()).filter(|line| is_country(line))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_country_is_its_code_on_a_line_of_its_own() {
        assert_eq!(CODES.split(' ').count(), 249);
        assert_eq!(country_of("1 Slip Road\n7000 Hobart\n AU \n"), Some("AU"));
        for other in ["1 Slip Road\nAustin, TX", "Oslo\nNorway", "Oslo\nno", "Oslo\nZZ", ""] {
            assert_eq!(country_of(other), None, "{other}");
        }
    }
}
