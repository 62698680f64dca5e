//! Files in and out: texts read with a guard, results written whole or not at all; the only user of `tempfile`.

use crate::diagnostic::Fault;
use std::io::{self, Read, Write};
use std::path::{Path, PathBuf};

/// Largest text that is read, in bytes.
const LARGEST: u64 = 64 << 20;

/// Reads a text; a folder, a pipe or device, a file above 64 MiB or one that is not UTF-8 is an error.
pub fn load(path: &Path) -> io::Result<String> {
    // Asked before the file is opened: opening a pipe waits for its other end.
    let kind = std::fs::metadata(path)?;
    if kind.is_dir() {
        return Err(io::Error::new(io::ErrorKind::IsADirectory, "it is a folder"));
    }
    if !kind.is_file() {
        return Err(io::Error::new(io::ErrorKind::Unsupported, "it is a pipe or a device"));
    }
    let file = std::fs::File::open(path)?;
    let mut bytes = Vec::new();
    // A file may grow while it is read: the guard is on what arrives.
    file.take(LARGEST + 1).read_to_end(&mut bytes)?;
    if bytes.len() as u64 > LARGEST {
        return Err(io::Error::new(io::ErrorKind::FileTooLarge, "it is larger than 64 MiB"));
    }
    String::from_utf8(bytes).map_err(|_| io::Error::new(io::ErrorKind::InvalidData, "it is not UTF-8 text"))
}

/// A folder that was made and found writable before the work.
#[derive(Debug)]
pub struct OutFolder {
    path: PathBuf,
}

impl OutFolder {
    /// Makes the folder and checks that files with these names can be made in it.
    ///
    /// # Errors
    /// What the system says, when they cannot.
    pub fn ready(path: &Path, names: &[&str]) -> io::Result<Self> {
        std::fs::create_dir_all(path)?;
        tempfile::Builder::new().prefix(".pinchbar-").tempfile_in(path)?;
        // A folder in a file's place would stop the renaming half-way.
        if let Some(name) = names.iter().find(|name| path.join(name).is_dir()) {
            return Err(io::Error::new(io::ErrorKind::IsADirectory, format!("{name} is a folder there")));
        }
        Ok(Self { path: path.to_path_buf() })
    }

    /// Where it is.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Writes all files beside their places, then renames each: a name never holds half a file. A file without content this time is removed.
    ///
    /// # Errors
    /// What the system says; nothing is renamed unless everything could be written.
    pub fn replace(&self, files: &[(&str, Option<Vec<u8>>)]) -> io::Result<()> {
        let mut written = Vec::new();
        for (name, content) in files {
            if let Some(content) = content {
                let mut file = tempfile::Builder::new().prefix(".pinchbar-").tempfile_in(&self.path)?;
                file.write_all(content)?;
                open_to_readers(file.as_file())?;
                written.push((name, file));
            }
        }
        for (name, file) in written {
            file.persist(self.path.join(name)).map_err(|e| e.error)?;
        }
        for (name, _) in files.iter().filter(|(_, content)| content.is_none()) {
            match std::fs::remove_file(self.path.join(name)) {
                Err(e) if e.kind() != io::ErrorKind::NotFound => return Err(e),
                _ => {}
            }
        }
        Ok(())
    }
}

/// Writes new files into a folder, which is made where it is missing: all of them or none, and never over a file that is there.
///
/// # Errors
/// A fault that names the file or folder; `elsewhere` is the remedy.
pub fn write_new(folder: &Path, files: &[(&str, String)], elsewhere: &str) -> Result<(), Fault> {
    let taken = |path: &Path| Fault {
        message: format!("{} is there already and is left as it is", path.display()),
        span: None,
        expected: None,
        remedy: Some(format!("{elsewhere}, or move that file away")),
        labels: Vec::new(),
    };
    // A link that leads nowhere is in the way as well.
    if let Some(path) = files.iter().map(|(name, _)| folder.join(name)).find(|p| p.symlink_metadata().is_ok()) {
        return Err(taken(&path));
    }
    let refused = |e: io::Error| unwritable(folder, &e, elsewhere);
    std::fs::create_dir_all(folder).map_err(refused)?;
    let mut written = Vec::new();
    for (name, content) in files {
        let mut file = tempfile::Builder::new().prefix(".pinchbar-").tempfile_in(folder).map_err(refused)?;
        file.write_all(content.as_bytes()).and_then(|()| open_to_readers(file.as_file())).map_err(refused)?;
        written.push((folder.join(name), file));
    }
    let mut placed: Vec<PathBuf> = Vec::new();
    for (path, file) in written {
        if let Err(e) = file.persist_noclobber(&path) {
            // Ours so far: half a job would be worse than none.
            placed.iter().for_each(|ours| drop(std::fs::remove_file(ours)));
            return Err(if e.error.kind() == io::ErrorKind::AlreadyExists { taken(&path) } else { refused(e.error) });
        }
        placed.push(path);
    }
    Ok(())
}

/// Why nothing can be written into a folder, with a remedy.
pub fn unwritable(folder: &Path, error: &io::Error, elsewhere: &str) -> Fault {
    let stands = |path: &Path| path.exists() && !path.is_dir();
    let why = match error.kind() {
        io::ErrorKind::AlreadyExists | io::ErrorKind::NotADirectory => match folder.ancestors().find(|p| stands(p)) {
            Some(file) if file != folder => format!("{} is a file, not a folder", file.display()),
            _ => "it is a file, not a folder".into(),
        },
        io::ErrorKind::PermissionDenied => "you may not write there".into(),
        io::ErrorKind::ReadOnlyFilesystem => "it is on a disk that is read-only".into(),
        io::ErrorKind::StorageFull => "the disk is full".into(),
        _ => error.to_string(),
    };
    Fault {
        message: format!("cannot write into {}: {why}", folder.display()),
        span: None,
        expected: Some("a folder that can be written, or made".into()),
        remedy: Some(elsewhere.into()),
        labels: Vec::new(),
    }
}

/// Temporary files are private; results are for colleagues too.
fn open_to_readers(file: &std::fs::File) -> io::Result<()> {
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        file.set_permissions(std::fs::Permissions::from_mode(0o644))?;
    }
    #[cfg(not(unix))]
    let _ = file;
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn results_replace_their_own_names_and_no_others() {
        let base = tempfile::tempdir().unwrap();
        let path = base.path().join("a/b");
        let folder = OutFolder::ready(&path, &["x", "y"]).unwrap();
        std::fs::write(path.join("foreign"), "kept").unwrap();
        folder.replace(&[("x", Some(b"1".to_vec())), ("y", Some(b"2".to_vec()))]).unwrap();
        folder.replace(&[("x", Some(b"3".to_vec())), ("y", None)]).unwrap();
        let mut left: Vec<_> = std::fs::read_dir(&path).unwrap().map(|e| e.unwrap().file_name().into_string().unwrap()).collect();
        left.sort();
        assert_eq!(left, ["foreign", "x"], "neither an old result nor a temporary file stays");
        assert_eq!(std::fs::read(path.join("x")).unwrap(), b"3");
    }

    #[test]
    fn what_cannot_be_written_is_told_before_the_work() {
        let base = tempfile::tempdir().unwrap();
        std::fs::write(base.path().join("file"), "").unwrap();
        assert!(OutFolder::ready(&base.path().join("file/below"), &[]).is_err());
        std::fs::create_dir(base.path().join("x")).unwrap();
        assert_eq!(OutFolder::ready(base.path(), &["x"]).unwrap_err().kind(), io::ErrorKind::IsADirectory);
    }

    #[test]
    fn new_files_are_written_all_or_none_and_never_over_old_ones() {
        let base = tempfile::tempdir().unwrap();
        let folder = base.path().join("a/b");
        let files = [("x", "1".to_string()), ("y", "2".to_string())];
        write_new(&folder, &files, "elsewhere").unwrap();
        assert_eq!(std::fs::read_to_string(folder.join("y")).unwrap(), "2");
        std::fs::remove_file(folder.join("x")).unwrap();
        let fault = write_new(&folder, &[("x", "3".into()), ("y", "4".into())], "elsewhere").unwrap_err();
        assert!(fault.message.contains("b/y is there already"), "{fault:?}");
        assert_eq!(std::fs::read_dir(&folder).unwrap().count(), 1, "nothing new beside the old file");
        assert_eq!(std::fs::read_to_string(folder.join("y")).unwrap(), "2");
    }

    #[test]
    fn a_folder_that_cannot_be_written_is_told_in_words() {
        let base = tempfile::tempdir().unwrap();
        let file = base.path().join("file");
        std::fs::write(&file, "").unwrap();
        for (kind, path, part) in [
            (io::ErrorKind::AlreadyExists, file.clone(), "file: it is a file, not a folder"),
            (io::ErrorKind::NotADirectory, file.join("below"), "file is a file, not a folder"),
            (io::ErrorKind::PermissionDenied, base.path().into(), "you may not write there"),
            (io::ErrorKind::ReadOnlyFilesystem, base.path().into(), "read-only"),
        ] {
            let fault = unwritable(&path, &kind.into(), "name another");
            assert!(fault.message.contains(part) && fault.remedy.as_deref() == Some("name another"), "{fault:?}");
        }
    }

    #[test]
    fn only_texts_are_read() {
        let base = tempfile::tempdir().unwrap();
        assert_eq!(load(base.path()).unwrap_err().kind(), io::ErrorKind::IsADirectory);
        #[cfg(unix)]
        {
            let pipe = base.path().join("pipe");
            assert!(std::process::Command::new("mkfifo").arg(&pipe).status().unwrap().success());
            for device in [Path::new("/dev/zero"), &pipe] {
                assert_eq!(load(device).unwrap_err().kind(), io::ErrorKind::Unsupported);
            }
        }
        std::fs::write(base.path().join("bytes"), [0xff, 0xfe]).unwrap();
        assert_eq!(load(&base.path().join("bytes")).unwrap_err().kind(), io::ErrorKind::InvalidData);
        // Sparse: it takes no room on the disk.
        std::fs::File::create(base.path().join("large")).unwrap().set_len(LARGEST + 1).unwrap();
        assert_eq!(load(&base.path().join("large")).unwrap_err().kind(), io::ErrorKind::FileTooLarge);
    }
}
