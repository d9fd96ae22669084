use std::fmt;

/// Rows under a heading, columns lined up, columns that are empty in every row left out.
pub(super) struct Table<const N: usize> {
    heading: [String; N],
    rows: Vec<[String; N]>,
}

impl<const N: usize> Table<N> {
    pub fn new(heading: [&str; N], rows: impl IntoIterator<Item = [String; N]>) -> Self {
        Self { heading: heading.map(str::to_owned), rows: rows.into_iter().collect() }
    }
}

impl<const N: usize> fmt::Display for Table<N> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let width = |column: usize| self.rows.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
        let columns: Vec<_> = (0..N)
            .filter(|column| width(*column) > 0)
            .map(|column| (column, width(column).max(self.heading[column].chars().count())))
            .collect();
        let mut write = |cell: &dyn Fn(usize) -> String| {
            let cells: Vec<_> = columns.iter().map(|(column, width)| format!("{:width$}", cell(*column))).collect();
            writeln!(f, "    {}", cells.join("   ").trim_end())
        };
        if columns.iter().any(|(column, _)| !self.heading[*column].is_empty()) {
            write(&|column| self.heading[column].clone())?;
        }
        self.rows.iter().try_for_each(|row| write(&|column| row[column].clone()))
    }
}
