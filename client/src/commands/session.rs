//! What commands share: the connection, and a day folder loaded into the service for as long as a
//! command needs it.

use crate::connect::connect;
use crate::day_folder::{self, DayFolder, Reading};
use crate::exit::{Failure, Terms};
use crate::screen::Screen;
use rimeshift_proto::v1::day_service_client::DayServiceClient;
use rimeshift_proto::v1::plan_service_client::PlanServiceClient;
use rimeshift_proto::v1::traffic_service_client::TrafficServiceClient;
use rimeshift_proto::v1::{
    Day, DeleteDayRequest, ListPolicyKeysRequest, LoadDayResponse, PolicyKey,
};
use std::path::Path;
use std::time::{SystemTime, UNIX_EPOCH};
use tokio::sync::mpsc;
use tokio_stream::wrappers::ReceiverStream;
use tonic::Status;
use tonic::transport::Channel;

/// The most warnings that are shown.
const MOST_WARNINGS: usize = 20;

/// A connection to the service.
#[derive(Debug)]
pub(crate) struct Session<'a> {
    channel: Channel,
    /// Where the command speaks.
    pub(crate) screen: &'a Screen,
}

/// A day folder that was read, and what the service made of it.
#[derive(Debug)]
pub(crate) struct LoadedDay {
    /// The folder.
    pub(crate) folder: DayFolder,
    /// The day.
    pub(crate) day: Day,
}

impl LoadedDay {
    /// What a status about this day means.
    pub(crate) fn failure(&self, status: &Status) -> Failure {
        Failure::of_status(status, Terms::Folder(&self.folder))
    }
}

impl<'a> Session<'a> {
    /// Connects to the service at an address, or to one of our own.
    ///
    /// # Errors
    /// When there is none.
    pub(crate) async fn open(
        server: Option<&str>,
        screen: &'a Screen,
    ) -> Result<Session<'a>, Failure> {
        Ok(Session { channel: connect(server).await?, screen })
    }

    /// The calls about days.
    pub(crate) fn days(&self) -> DayServiceClient<Channel> {
        DayServiceClient::new(self.channel.clone())
    }

    /// The calls about filed traffic.
    pub(crate) fn traffic(&self) -> TrafficServiceClient<Channel> {
        TrafficServiceClient::new(self.channel.clone())
    }

    /// The calls about plans.
    pub(crate) fn plans(&self) -> PlanServiceClient<Channel> {
        PlanServiceClient::new(self.channel.clone())
    }

    /// The keys of the policy, with the values of a day or the defaults (`day` empty).
    ///
    /// # Errors
    /// When the service has no answer.
    pub(crate) async fn policy_keys(&self, day: &str) -> Result<Vec<PolicyKey>, Failure> {
        let request = ListPolicyKeysRequest { day: day.to_owned() };
        match self.days().list_policy_keys(request).await {
            Ok(response) => Ok(response.into_inner().keys),
            Err(status) => Err(Failure::of_status(&status, Terms::Fields)),
        }
    }

    /// Reads a day folder, loads it, and says what is odd about it.
    ///
    /// # Errors
    /// Every defect of the folder; no service.
    pub(crate) async fn load_day(
        &self,
        folder: &Path,
        proposals: Option<&Path>,
    ) -> Result<LoadedDay, Failure> {
        let keys: Vec<String> =
            self.policy_keys("").await?.into_iter().map(|key| key.key).collect();
        let progress = self.screen.begin(&format!("reading {}", folder.display()));
        let reading = Reading { policy_keys: &keys, proposals };
        let (day, mut warnings) = day_folder::read(folder, reading).map_err(Failure::BadInput)?;
        progress.set_message("loading the day");
        let loaded = self.send(&day, &day_id()).await;
        progress.finish_and_clear();
        let loaded = loaded.map_err(|status| Failure::of_status(&status, Terms::Folder(&day)))?;
        warnings.extend(loaded.warnings.iter().map(|warning| {
            let message = day.in_file_terms(&warning.message);
            match warning.path.as_str() {
                "" => message,
                path => format!("{}: {message}", day.place_of(path)),
            }
        }));
        let unsent = (loaded.warning_count as usize).saturating_sub(loaded.warnings.len());
        self.warn(&warnings, unsent);
        Ok(LoadedDay { folder: day, day: loaded.day.unwrap_or_default() })
    }

    async fn send(&self, folder: &DayFolder, day_id: &str) -> Result<LoadDayResponse, Status> {
        let (sender, receiver) = mpsc::channel(2);
        let sending = async move {
            for request in folder.requests(day_id) {
                // The service has ended the stream: its answer says why.
                if sender.send(request).await.is_err() {
                    break;
                }
            }
        };
        let mut days = self.days();
        let (response, ()) = tokio::join!(days.load_day(ReceiverStream::new(receiver)), sending);
        Ok(response?.into_inner())
    }

    fn warn(&self, warnings: &[String], unsent: usize) {
        for warning in warnings.iter().take(MOST_WARNINGS) {
            self.screen.say(&format!("warning: {warning}"));
        }
        let more = warnings.len().saturating_sub(MOST_WARNINGS) + unsent;
        if more > 0 {
            self.screen.say(&format!("… and {more} more warnings"));
        }
    }

    /// Takes a day out of the service again, so that one that serves others does not fill up.
    pub(crate) async fn forget(&self, day: &LoadedDay) {
        let request = DeleteDayRequest { name: day.day.name.clone() };
        if let Err(status) = self.days().delete_day(request).await {
            self.screen.say(&format!(
                "warning: {} stays in the service: {}",
                day.day.name,
                status.message()
            ));
        }
    }
}

/// An id that no other client uses.
fn day_id() -> String {
    let since = SystemTime::now().duration_since(UNIX_EPOCH).unwrap_or_default();
    format!("cli-{}-{:x}", std::process::id(), since.as_nanos())
}
