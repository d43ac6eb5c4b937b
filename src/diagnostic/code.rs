//! The kinds of complaint. Their names are words; each has a record under `tests/complaints/` that triggers it.

use super::Severity;

macro_rules! codes {
    ($($variant:ident $word:literal $severity:ident $meaning:literal;)*) => {
        /// A kind of complaint.
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub enum Code { $(#[doc = $meaning] $variant,)* }

        impl Code {
            /// Every kind, in order of name.
            pub const ALL: &'static [Code] = &[$(Code::$variant,)*];

            /// The word printed with the complaint.
            pub fn word(self) -> &'static str {
                match self { $(Code::$variant => $word,)* }
            }

            /// Whether results can stand beside it.
            pub fn severity(self) -> Severity {
                match self { $(Code::$variant => Severity::$severity,)* }
            }

            /// What the complaint means, in one line.
            pub fn meaning(self) -> &'static str {
                match self { $(Code::$variant => $meaning,)* }
            }
        }
    };
}

codes! {
    AlreadyIssued "already_issued" Fault "A report with this very content was issued already.";
    BareNumber "bare_number" Fault "A number stands without the unit its quantity needs.";
    BasisMismatch "basis_mismatch" Fault "Two masses on different unit bases meet in one sum.";
    CalibrationsOneSided "calibrations_one_sided" Fault "A resistor was used outside the dates of its calibrations without a stated hold.";
    CellUnreadable "cell_unreadable" Fault "A cell of a raw data file is empty, no number, or not finite.";
    CertificateExpired "certificate_expired" Fault "A certificate was past its due date on the day of use.";
    CertificateMissing "certificate_missing" Fault "No calibration was valid on the day of use.";
    CheckOverdue "check_overdue" Warning "A check between realizations had run out when the campaign began.";
    CircularReference "circular_reference" Fault "Values refer to each other in a circle.";
    ClockBehind "clock_behind" Fault "The clock stands before the last entry of the register.";
    ColumnImplausible "column_implausible" Fault "A column holds what its meaning does not allow: exchanged columns, or another unit.";
    ColumnUnknown "column_unknown" Fault "A raw data file has no column with this head, or has it twice.";
    ConditionsOutOfSpan "conditions_out_of_span" Fault "Conditions are asked for at a time outside the logged span.";
    ContentMissing "content_missing" Fault "A report lacks content it must have, and no reason is recorded.";
    ConventionMismatch "convention_mismatch" Fault "Values that must follow one convention follow two.";
    CorrectionUnfit "correction_unfit" Fault "A correction does not fit the file it names, or would not be seen wherever the file is used.";
    CorrelationImpossible "correlation_impossible" Fault "Stated correlations or covariances contradict each other.";
    CustomerForeign "customer_foreign" Fault "Data of another customer are among what a report rests on.";
    DecimalComma "decimal_comma" Fault "A number is written with a decimal comma.";
    DesignIncomplete "design_incomplete" Fault "A cycle, series or list has not the number of readings its kind needs.";
    DimensionMismatch "dimension_mismatch" Fault "A value has another dimension than its quantity.";
    DoubleUncertainty "double_uncertainty" Fault "A reading carries its own uncertainty beside that of its instrument.";
    DuplicateKey "duplicate_key" Fault "A field stands twice in one block.";
    DuplicateName "duplicate_name" Fault "Two blocks carry the same name.";
    ElectricBasis "electric_basis" Fault "A voltage or resistance is in the electric units of 1990 without a stated conversion.";
    ExclusionWithoutReason "exclusion_without_reason" Fault "An excluded cycle or run lacks a rule or a reason.";
    Extrapolated "extrapolated" Warning "A fit is asked for outside the range of its points, or close to its ends.";
    FewReadings "few_readings" Warning "A Type A evaluation rests on so few readings that its variance is unknown.";
    FieldMissing "field_missing" Fault "A block lacks a field it needs.";
    FieldUnknown "field_unknown" Fault "A block has a field its kind does not know.";
    FigureMissing "figure_missing" Fault "A report cites a result that does not exist or could not be computed.";
    FileMissing "file_missing" Fault "A file named in a record cannot be read.";
    FirstOrderShort "first_order_short" Warning "First-order propagation understates an uncertainty: the formula bends within it.";
    FormatUnsupported "format_unsupported" Fault "The laboratory folder asks for another record format.";
    FringeFactor "fringe_factor" Fault "Fringes and positions disagree by a factor of two.";
    GradientAssumed "gradient_assumed" Warning "The gradient of gravity was not measured; that of free air stands in.";
    KindMismatch "kind_mismatch" Fault "Two kinds of quantity that must not be mixed meet.";
    KindUnknown "kind_unknown" Fault "A measurement block is of a kind nobody knows.";
    LodgedFileChanged "lodged_file_changed" Fault "A file was changed or removed after it was lodged, without a correction.";
    MassInPrimary "mass_in_primary" Fault "A mass has weight in the result of a primary method and is not declared auxiliary.";
    NameInvalid "name_invalid" Fault "A name is not a letter followed by letters, digits and underscores.";
    NotAuthorised "not_authorised" Fault "A report was not reviewed or authorised as it stands now.";
    NotLodged "not_lodged" Fault "A report rests on a record or raw data that were never lodged.";
    NotationUnreadable "notation_unreadable" Fault "A value is written in no known notation.";
    OutOfRange "out_of_range" Fault "A reading lies outside the range of its instrument.";
    OutOfValidity "out_of_validity" Fault "A value lies outside the range in which a formula is valid.";
    PathOutside "path_outside" Fault "A path leaves the laboratory folder.";
    PdfUnreadable "pdf_unreadable" Fault "A PDF cannot be read back as a report.";
    PersonUnauthorised "person_unauthorised" Fault "A person is unknown, or not authorised for this activity on this day.";
    ProseUnreadable "prose_unreadable" Fault "Prose uses something a report cannot typeset.";
    ReadingsCorrelated "readings_correlated" Warning "The uncertainty of a mean is claimed for independent readings, but they depend on their neighbours.";
    RecordUnreadable "record_unreadable" Fault "A record is no readable text, or its front matter is damaged.";
    RegisterDamaged "register_damaged" Fault "The register does not hold together.";
    RegisterUnwritable "register_unwritable" Fault "The register, or what is kept with it, cannot be read or written.";
    ReportUnknown "report_unknown" Fault "No report has this number, or its state does not allow what is asked.";
    ResultsInconsistent "results_inconsistent" Warning "Results combined disagree by more than their uncertainties let expect.";
    RuleDated "rule_dated" Fault "A rule is dated after the data it judges.";
    RunUnexplained "run_unexplained" Fault "A run of the same item is not used by a report, and no reason is recorded.";
    RunUnlisted "run_unlisted" Fault "A determination of a campaign is not listed with its result.";
    SameValueTwice "same_value_twice" Warning "The same value and uncertainty stand in two blocks: one input or two?";
    ShapeMismatch "shape_mismatch" Fault "A field holds a list, a mapping or text where another is expected.";
    SignContradicts "sign_contradicts" Fault "Signs in one row contradict each other: direction, fringes and steps, or state and current.";
    SilentComment "silent_comment" Fault "A # after a value would start a comment nobody sees.";
    StateMismatch "state_mismatch" Fault "A value in vacuum meets a value in air without a stated link.";
    StepMiscount "step_miscount" Fault "The steps of a sweep or gate are off by about one.";
    SubmittedValueChanged "submitted_value_changed" Fault "A result no longer prints the value that was handed in.";
    SweepsOneWay "sweeps_one_way" Fault "All sweeps go one way.";
    TemplateFaulty "template_faulty" Fault "A template or an expression in double braces cannot be evaluated.";
    TimeGap "time_gap" Warning "Rows are missing inside a sweep.";
    TimeUnreadable "time_unreadable" Fault "A date or time is unreadable, lacks its zone, or does not follow.";
    TypesettingFailed "typesetting_failed" Fault "The typesetter could not make the page.";
    UncertaintyIncomplete "uncertainty_incomplete" Fault "An uncertainty lacks its coverage factor or distribution.";
    UncertaintyMissing "uncertainty_missing" Fault "A value that needs an uncertainty has none.";
    UnclosedFence "unclosed_fence" Fault "A fenced block is never closed.";
    UndefinedReference "undefined_reference" Fault "A name refers to nothing.";
    UnitUnknown "unit_unknown" Fault "A unit symbol is unknown.";
    ValueUnusual "value_unusual" Warning "A value is possible but unusual; a slip of the pen looks like that.";
    YamlForbidden "yaml_forbidden" Fault "A block uses an anchor, alias, tag, merge key or second document.";
    YamlUnreadable "yaml_unreadable" Fault "A block is no readable YAML.";
}
