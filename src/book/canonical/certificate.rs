//! A certificate: its number and what makes its document.

use super::{Canonical, Reader, Unreadable, Writer, canonical_choice, canonical_struct, header};
use crate::book::certificates::CertificateFiles;
use crate::entry::{Certificate, CertificateAmends, CertificateDraft, CertificateTexts, CertifiedRun, Sheet};

canonical_choice!(Sheet, "paper" { A4 = 1, Letter = 2 });
canonical_struct!(CertificateTexts {
    customer,
    customer_address,
    without_serial,
    condition,
    work_done,
    received,
    place,
    supplied,
    interval,
    remarks,
});
canonical_struct!(CertificateAmends { number, replaces, what, why, xml });
canonical_struct!(CertificateDraft {
    results,
    as_found,
    shop_revision,
    orifice_revision,
    signatory,
    sheet,
    texts,
    amends,
    issued,
    method_revision,
    program,
});
canonical_struct!(Certificate { number, counter, year, head, draft });
canonical_struct!(CertificateFiles { pdf, xml });

impl Canonical for CertifiedRun {
    fn write(&self, out: &mut Writer) {
        let Self { run, header: of_run, before } = self;
        run.write(out);
        header::write(of_run, out);
        before.write(out);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        let (run, of_run) = (Canonical::read(from)?, header::read(from)?);
        Ok(Self { run, header: of_run, before: Canonical::read(from)? })
    }
}
