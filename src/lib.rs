//! kinmark maps homologous brain parcels between two species.
//!
//! From a connectivity matrix for each species and a few landmark parcels assumed homologous it
//! embeds both species, brings the embeddings together at the landmarks (weighted Procrustes and
//! ridge canonical correlation), and says where every other parcel falls, how sure that is, and how
//! well landmarks fare when they are left out.
//!
//! Data flow one way: [`input`] reads files into [`domain`] types; [`prepare`] checks, transforms
//! ([`transform`], [`affinity`]) and embeds ([`mod@embed`]) them; [`mod@locate`] aligns
//! ([`mod@align`]), ranks ([`evidence`], [`place`]), leaves landmarks out ([`holdout`]) and
//! bootstraps ([`bootstrap`]); [`report`] writes. [`pipeline`] runs these in order, and [`mod@paint`]
//! puts a finished run back onto surfaces, and
//! [`page`] makes it a page to look at; both read it through [`finished`].
//!
//! Everything found is a statistical hypothesis about homology, never a target for stimulation or
//! surgery.

// Tests may unwrap: a panic there is a failed test.
#![cfg_attr(not(test), warn(clippy::unwrap_used))]

pub mod affinity;
pub mod align;
pub mod bootstrap;
pub mod domain;
pub mod draft;
pub mod embed;
pub mod error;
pub mod evidence;
pub mod finished;
pub mod holdout;
pub mod input;
pub mod inspect;
pub mod linalg;
pub mod locate;
pub mod page;
pub mod paint;
pub mod pipeline;
pub mod place;
pub mod prepare;
pub mod questions;
pub mod reopen;
pub mod report;
pub mod settings;
pub mod species;
pub mod transform;
pub mod transport;
pub mod warning;
pub mod watch;
