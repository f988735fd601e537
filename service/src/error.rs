//! Everything that a call can fail with, and the one table from there to gRPC statuses.
//!
//! A status carries google.rpc details: always `ErrorInfo` with a reason of the table and the
//! domain `rimeshift`, and beside it the detail that belongs to the kind of error.

use rimeshift_engine::day::{Defect, MOST_DEFECTS};
use tonic::{Code, Status};
use tonic_types::{ErrorDetails, FieldViolation, PreconditionViolation, QuotaViolation, StatusExt};

/// The domain of every reason.
pub const ERROR_DOMAIN: &str = "rimeshift";

/// What a call failed with.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub(crate) enum ServiceError {
    /// Fields of the request are bad.
    #[error("{}", bad_fields_message(.defects))]
    BadFields {
        /// What is wrong, at least one entry.
        defects: Vec<Defect>,
        /// How many of them the caller can take.
        room: DetailRoom,
    },
    /// There is no such resource.
    #[error("there is no {kind} `{name}`")]
    NotFound { kind: Kind, name: String },
    /// The resource is there already.
    #[error("{kind} `{name}` is there already")]
    AlreadyExists { kind: Kind, name: String },
    /// The state of a resource forbids it.
    #[error("{subject}: {problem}")]
    Precondition { subject: String, problem: String },
    /// A limit of the service is reached.
    #[error("{subject}: {problem}")]
    Exhausted { subject: &'static str, problem: String },
    /// The caller has gone or taken the call back.
    #[error("the call was cancelled")]
    Cancelled,
    /// The deadline has passed.
    #[error("{0}")]
    DeadlineExceeded(String),
    /// A defect of the program.
    #[error("the service failed on this call; its log says more")]
    Internal,
}

/// What kind of resource.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Kind {
    /// A day.
    Day,
    /// A kept plan.
    Plan,
}

impl std::fmt::Display for Kind {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Self::Day => "day",
            Self::Plan => "plan",
        })
    }
}

impl Kind {
    /// The resource type, as AIP-123 writes it.
    fn resource_type(self) -> &'static str {
        match self {
            Self::Day => "rimeshift/Day",
            Self::Plan => "rimeshift/Plan",
        }
    }

    /// Several of them, as the subject of a limit.
    pub(crate) fn plural(self) -> &'static str {
        match self {
            Self::Day => "days",
            Self::Plan => "plans",
        }
    }
}

/// How much detail about bad fields a status may carry.
///
/// Details travel as a response header, and clients refuse long ones: 8 KiB is what all take.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum DetailRoom {
    /// As many entries as fit into what any client takes.
    AnyClient,
    /// So many entries; the caller takes long headers.
    Entries(usize),
}

/// Bytes of details that fit into 8 KiB of headers after base64 (4/3) beside the other headers.
const ANY_CLIENT_BYTES: usize = 4800;
/// The same for 128 KiB.
const LARGE_BYTES: usize = 90_000;

impl DetailRoom {
    /// The room that a request asks for by a number; 0 is any client's.
    pub(crate) fn of_request(entries: u32) -> Self {
        match usize::try_from(entries) {
            Ok(0) => Self::AnyClient,
            Ok(n) => Self::Entries(n.min(MOST_DEFECTS)),
            Err(_) => Self::Entries(MOST_DEFECTS),
        }
    }

    fn entries_and_bytes(self) -> (usize, usize) {
        match self {
            Self::AnyClient => (MOST_DEFECTS, ANY_CLIENT_BYTES),
            Self::Entries(n) => (n, LARGE_BYTES),
        }
    }
}

impl ServiceError {
    /// One bad field.
    pub(crate) fn bad_field(
        path: impl Into<String>,
        problem: impl Into<String>,
        hint: impl Into<String>,
    ) -> Self {
        Self::bad_fields(vec![Defect {
            path: path.into(),
            problem: problem.into(),
            hint: hint.into(),
        }])
    }

    /// Bad fields, listed as far as any client can take.
    pub(crate) fn bad_fields(defects: Vec<Defect>) -> Self {
        Self::BadFields { defects, room: DetailRoom::AnyClient }
    }

    /// The gRPC code and the reason: the table.
    pub(crate) fn code_and_reason(&self) -> (Code, &'static str) {
        match self {
            Self::BadFields { .. } => (Code::InvalidArgument, "BAD_FIELDS"),
            Self::NotFound { .. } => (Code::NotFound, "NOT_FOUND"),
            Self::AlreadyExists { .. } => (Code::AlreadyExists, "ALREADY_EXISTS"),
            Self::Precondition { .. } => (Code::FailedPrecondition, "PRECONDITION"),
            Self::Exhausted { .. } => (Code::ResourceExhausted, "LIMIT_REACHED"),
            Self::Cancelled => (Code::Cancelled, "CANCELLED"),
            Self::DeadlineExceeded(_) => (Code::DeadlineExceeded, "DEADLINE_EXCEEDED"),
            Self::Internal => (Code::Internal, "INTERNAL"),
        }
    }

    fn details(&self) -> ErrorDetails {
        let (_, reason) = self.code_and_reason();
        let mut details = ErrorDetails::with_error_info(reason, ERROR_DOMAIN, []);
        match self {
            Self::BadFields { defects, room } => {
                details.set_bad_request(field_violations(defects, *room));
            }
            Self::NotFound { kind, name } | Self::AlreadyExists { kind, name } => {
                details.set_resource_info(kind.resource_type(), name, "", self.to_string());
            }
            Self::Precondition { subject, problem } => {
                details.set_precondition_failure(vec![PreconditionViolation::new(
                    "STATE", subject, problem,
                )]);
            }
            Self::Exhausted { subject, problem } => {
                details.set_quota_failure(vec![QuotaViolation::new(*subject, problem)]);
            }
            Self::Cancelled | Self::DeadlineExceeded(_) | Self::Internal => {}
        }
        details
    }
}

impl From<ServiceError> for Status {
    fn from(error: ServiceError) -> Self {
        let (code, _) = error.code_and_reason();
        Self::with_error_details(code, shortened(&error.to_string(), 500), error.details())
    }
}

fn bad_fields_message(defects: &[Defect]) -> String {
    match defects {
        [] => "the request is bad".to_owned(),
        [only] => only.to_string(),
        [first, others @ ..] => format!("{first}; and {} more", others.len()),
    }
}

/// As many violations as there is room for; what is left out is counted by a last entry.
fn field_violations(defects: &[Defect], room: DetailRoom) -> Vec<FieldViolation> {
    let (most_entries, most_bytes) = room.entries_and_bytes();
    let mut bytes = 0;
    let mut violations = Vec::new();
    for defect in defects.iter().take(most_entries) {
        let description = if defect.hint.is_empty() {
            defect.problem.clone()
        } else {
            format!("{} ({})", defect.problem, defect.hint)
        };
        let violation =
            FieldViolation::new(shortened(&defect.path, 200), shortened(&description, 400));
        bytes += violation.field.len() + violation.description.len() + 8;
        if bytes > most_bytes {
            break;
        }
        violations.push(violation);
    }
    let left_out = defects.len() - violations.len();
    if left_out > 0 {
        violations.push(FieldViolation::new("", format!("{left_out} more are not listed here")));
    }
    violations
}

/// Text of at most so many bytes, cut between characters.
fn shortened(text: &str, most_bytes: usize) -> String {
    if text.len() <= most_bytes {
        return text.to_owned();
    }
    let end = (0..=most_bytes).rev().find(|&i| text.is_char_boundary(i)).unwrap_or(0);
    format!("{}...", text.get(..end).unwrap_or_default())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn defect(i: usize) -> Defect {
        Defect {
            path: format!("flights[{i}].points[0].level_ft"),
            problem: "FL 9000 is not plausible".to_owned(),
            hint: "FL -20 to 660".to_owned(),
        }
    }

    /// Every kind of error, its code and reason as seen by a caller.
    #[test]
    fn each_error_keeps_its_code_reason_and_detail_over_the_wire() {
        let name = || "days/x".to_owned();
        let samples = [
            (ServiceError::bad_fields(vec![defect(0)]), Code::InvalidArgument, "bad_request"),
            (ServiceError::NotFound { kind: Kind::Day, name: name() }, Code::NotFound, "resource"),
            (
                ServiceError::AlreadyExists { kind: Kind::Plan, name: name() },
                Code::AlreadyExists,
                "resource",
            ),
            (
                ServiceError::Precondition { subject: name(), problem: "p".into() },
                Code::FailedPrecondition,
                "precondition",
            ),
            (
                ServiceError::Exhausted { subject: "days", problem: "p".into() },
                Code::ResourceExhausted,
                "quota",
            ),
            (ServiceError::Cancelled, Code::Cancelled, ""),
            (ServiceError::DeadlineExceeded("late".into()), Code::DeadlineExceeded, ""),
            (ServiceError::Internal, Code::Internal, ""),
        ];
        for (error, code, detail) in samples {
            let (_, reason) = error.code_and_reason();
            // Through headers and back, as a client sees it.
            let headers = Status::from(error.clone()).into_http::<()>().into_parts().0.headers;
            let status = Status::from_header_map(&headers).unwrap();
            assert_eq!(status.code(), code);
            assert_eq!(status.message(), error.to_string());
            let details = status.get_error_details();
            let info = details.error_info().unwrap();
            assert_eq!((info.reason.as_str(), info.domain.as_str()), (reason, ERROR_DOMAIN));
            let present = [
                ("bad_request", details.bad_request().is_some()),
                ("resource", details.resource_info().is_some()),
                ("precondition", details.precondition_failure().is_some()),
                ("quota", details.quota_failure().is_some()),
            ];
            for (name, is_there) in present {
                assert_eq!(is_there, name == detail, "{name} of {error}");
            }
        }
    }

    #[test]
    fn bad_fields_fit_into_any_client_and_the_rest_is_counted() {
        let error = ServiceError::bad_fields((0..100).map(defect).collect());
        let headers = Status::from(error).into_http::<()>().into_parts().0.headers;
        let bytes: usize = headers.iter().map(|(k, v)| k.as_str().len() + v.len() + 32).sum();
        assert!(bytes < 8192, "{bytes}");
        let details = Status::from_header_map(&headers).unwrap().get_error_details();
        let violations = &details.bad_request().unwrap().field_violations;
        let (last, listed) = violations.split_last().unwrap();
        assert_eq!(last.description, format!("{} more are not listed here", 100 - listed.len()));
    }

    #[test]
    fn a_caller_that_takes_long_headers_gets_all() {
        let error = ServiceError::BadFields {
            defects: (0..100).map(defect).collect(),
            room: DetailRoom::of_request(100),
        };
        let details = Status::from(error).get_error_details();
        assert_eq!(details.bad_request().unwrap().field_violations.len(), 100);
    }

    #[test]
    fn long_text_is_cut_between_characters() {
        assert_eq!(shortened("aéé", 2), "a...");
        assert_eq!(shortened("aé", 3), "aé");
    }
}
