//! How far a certificate meets the standards it follows, item by item. Documentation only: there is no code here.
//!
//! Marks: **enforced**: nothing is issued without it, or a test holds it; **met by absence**: what is forbidden cannot be said;
//! **documented only**: there is a place for it, and whether it is filled rightly is for people; **not met**; **n/a**, not
//! applicable. No claim of accreditation follows from any of it, and the program makes none.
//!
//! # ISO/IEC 17025:2017, 7.8
//!
//! The items are told in our own words and from memory: no text of the standard was at hand when this was written. Whoever has
//! it is asked to compare.
//!
//! | item | what it asks for | mark | where |
//! |---|---|---|---|
//! | 7.8.2.1 a | a title | enforced | `Content::title`, a constant |
//! | b | name and address of who calibrates | enforced | `Issue::shop`; `complete::problems` asks for both, and for the country |
//! | c | where the work was done | enforced | `Content::place`: `Issue::place`, else the shop's address; that it is true is for the shop |
//! | d | known on every page as a part, and a marked end | enforced | `Issue::number` in `Document::running_head`, "page i of n" by `paper`, `Document::end`; that no number is given twice is the book's |
//! | e | name of the customer and how to reach them | enforced | `Issue::customer`: name and address asked for; `contact` may be missing |
//! | f | the method | enforced | `Content::method`: name, standards, revision |
//! | g | description, identity and condition of the item | enforced in part | description and serial number (or that there is none) by `complete`; `Issue::condition` may be missing: documented only |
//! | h | date of receipt, where it matters | documented only | `Issue::received`; enforced that it does not lie after the first reading |
//! | i | dates of the work | enforced | `Content::performed`, from the runs |
//! | j | date of issue | enforced | `Issue::issued`, not before the last run |
//! | k | plan and method of sampling | n/a | the item itself is calibrated |
//! | l | that results relate only to the item | enforced | `StatementKind::Scope`, on the first page |
//! | m | results, with units | enforced | `Figure` has no value without a `Unit`; a number that is not finite forbids issuing |
//! | n | departures from the method | enforced in part | points left out stand in the table with their reason (`PointRow::why_not`), warnings in `Calibration::warnings`; anything else is a remark of the shop (`Issue::remarks`): documented only |
//! | o | who authorises it | enforced | `Issue::signatory`; a place to sign, since there is no electronic signature |
//! | p | what comes from elsewhere is marked | documented only | there is no field for subcontracted results; `Issue::remarks` |
//! | note | copied only in full | enforced | `StatementKind::Copying` |
//! | 7.8.2.2 | what the customer supplied is marked, with a disclaimer | documented only | `Issue::supplied` → `StatementKind::Supplied`: "not verified here"; what belongs there the shop says. That it may have affected the results is not said: not met |
//! | 7.8.4.1 a | uncertainty in the unit of the result, or as a share | enforced | `Figure`: value, U, k and p in one unit, or a named reason why there is no uncertainty (`NoUncertainty`) |
//! | b | conditions that influence the result | enforced | `Calibration::conditions`, gas, reference conditions of every flow (`Figure::reference`) |
//! | c | how the results are traceable | enforced | `StatementKind::Traceability`; an instrument without certificate number or due date, or out of date on the day, forbids issuing; that its papers are worth something is for the shop |
//! | d | results before and after adjustment or repair | enforced | `Content::as_found` and `results`, `changed_by_work`; with a run as found, `Issue::work_done` is asked for. That there was one is for the shop to say |
//! | e | conformity, where relevant | enforced | `Calibration::conformity`, only where limits were agreed |
//! | f | opinions and interpretations | met by absence | none are generated; a shop's own text in `Issue::remarks` is its own to sign for |
//! | 7.8.4.2 | sampling by the laboratory | n/a | nothing is sampled |
//! | 7.8.4.3 | no interval of calibration unless agreed | met by absence | `Issue::interval` is empty unless the customer asked, and is printed as their request. Due dates of the shop's own instruments are another thing |
//! | 7.8.6.1 | a documented decision rule that weighs the risk | enforced | guarded or simple acceptance (`Conformity::rule`), with the probability of conformity beside it; choosing the rule is for shop and customer |
//! | 7.8.6.2 | which results, which limits met or not, which rule | enforced | `Conformity`: the judged flow, its limits, the guarded limits, the verdict with its reason; `StatementKind::DecisionRule` |
//! | 7.8.8.1 | what changed and why, in the new document | enforced | `Amendment::what` and `Amendment::why`, on the first page |
//! | 7.8.8.2 | changed only by a further document | enforced | `Amendment::replaces` names the first and `Amendment::instead` says whether it is replaced or amended; that it stays as it was is the book's |
//! | 7.8.8.3 | a whole new one has its own number and names what it replaces | enforced | `complete` refuses an amendment that replaces itself, or says nothing of what or why |
//!
//! # Digital calibration certificate, schema 3.3.0
//!
//! `scripts/validate_dcc.py` holds every kind of certificate of the tests against the schema, its Schematron rules and the units
//! of the D-SI, where the schema is at hand; it is not carried here.
//!
//! | element | mark | what stands in it |
//! |---|---|---|
//! | `administrativeData/dccSoftware` | enforced | the program with its version |
//! | `refTypeDefinitions` | enforced | the common terms, and our own, each of which is a place of the document |
//! | `coreData` | enforced | country, language, number, dates, place of work, `reportAmendedSubstituted` and `previousReport` where it replaces another |
//! | `items/item` | enforced | one item; serial number and name in the register; maker, condition |
//! | `calibrationLaboratory`, `customer` | enforced | addresses line by line in `further`: nothing is guessed of what is street and what is town |
//! | `respPersons` | enforced | who authorises (main signer) and who measured |
//! | `statements` | enforced | every statement and caution |
//! | `measurementResults` | enforced | one for the results, one for the run as found; method with its reference conditions, software, equipment, influences, results |
//! | `measurementMetaData`, `metaData/conformity` | enforced | verdict, rule, limits. Undecided becomes `noPass`, since the schema has no word for it; the text says undecided |
//! | `data/quantity`, `list` | enforced | `si:hybrid` of the unit read and an SI unit, `si:expandedMU` with k and p, `si:realListXMLList` for tables; covariance of the line |
//! | `description/file` | enforced | run files, readings and what is stated, with their digests in words |
//! | `comment`, `document` | absent | nothing for them to say; the PDF carries the XML, not the reverse |
//! | `byteData`, `xml`, other languages | absent | not needed |
//! | `ds:Signature` | not met | a person signs the paper; the digests of the book tell a changed one |
//!
//! # PDF/A-3A (ISO 19005-3)
//!
//! Conformance is checked by the writer alone, which refuses what it knows to be against the standard; no independent validator ran.
