//! What is kept in the browser, by IndexedDB: in `cases` the kept cases, in `files` the files of their records.
//!
//! It stands in the worker's program because the library for it would add 20 kB (gzipped) to the page's; the page has a worker of
//! its own for it, which never computes.

use std::cell::RefCell;
use std::error::Error;
use std::rc::Rc;

use js_sys::{Array, Object, Reflect};
use rexie::{ObjectStore, Rexie, TransactionMode};
use wasm_bindgen::JsValue;

use super::{Act, Trouble};

const CASES: &str = "cases";
const FILES: &str = "files";

thread_local! {
    static DATABASE: RefCell<Option<Rc<Rexie>>> = const { RefCell::new(None) };
}

/// Does it, and gives back what was taken from there.
pub(super) async fn keep(act: Act, beside: &Array) -> Result<Array, Trouble> {
    let database = database().await.map_err(|_unopened| Trouble::Denied)?;
    let writes = matches!(act, Act::Put { .. });
    done(&database, act, beside).await.map_err(|error| {
        let aborted = writes && error == rexie::Error::TransactioncommitFailed;
        let full = aborted || error.source().is_some_and(|source| source.to_string().contains("Quota"));
        if full { Trouble::Full } else { Trouble::Refused }
    })
}

async fn done(database: &Rexie, act: Act, beside: &Array) -> rexie::Result<Array> {
    let mut found = Array::new();
    let mode = if matches!(act, Act::List | Act::Files { .. }) {
        TransactionMode::ReadOnly
    } else {
        TransactionMode::ReadWrite
    };
    let transaction = database.transaction(&[CASES, FILES], mode)?;
    let (cases, files) = (transaction.store(CASES)?, transaction.store(FILES)?);
    match act {
        Act::List => found = cases.get_all(None, None).await?.into_iter().collect(),
        Act::Put { id, record } => {
            let list = beside.get(1);
            if !record {
                files.delete(id.as_str().into()).await?;
            } else if list.is_object() {
                let entry = Object::new();
                // A plain object takes any property.
                let _ = Reflect::set(&entry, &"id".into(), &id.as_str().into());
                let _ = Reflect::set(&entry, &"files".into(), &list);
                files.put(&entry, None).await?;
            }
            cases.put(&beside.get(0), None).await?;
        }
        Act::Files { id } => {
            let entry = files.get(id.as_str().into()).await?.unwrap_or(JsValue::UNDEFINED);
            if entry.is_object()
                && let Ok(list) = Reflect::get(&entry, &"files".into())
            {
                found = Array::from(&list);
            }
        }
        Act::Remove { id } => {
            cases.delete(id.as_str().into()).await?;
            files.delete(id.as_str().into()).await?;
        }
        Act::Clear => {
            cases.clear().await?;
            files.clear().await?;
        }
    }
    // A transaction that found no room for what it had taken ends without an error of its own.
    if transaction.done().await?.is_committed() {
        Ok(found)
    } else {
        Err(rexie::Error::TransactioncommitFailed)
    }
}

async fn database() -> rexie::Result<Rc<Rexie>> {
    if let Some(database) = DATABASE.with_borrow(Clone::clone) {
        return Ok(database);
    }
    let database = Rexie::builder("millpond")
        .version(1)
        .add_object_store(ObjectStore::new(CASES).key_path("id"))
        .add_object_store(ObjectStore::new(FILES).key_path("id"))
        .build()
        .await?;
    let database = Rc::new(database);
    DATABASE.with_borrow_mut(|held| *held = Some(Rc::clone(&database)));
    Ok(database)
}
