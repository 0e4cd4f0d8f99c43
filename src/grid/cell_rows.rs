//! Some cells of the plane in order of row and column, found by row without searching the rest.

use std::ops::Range;

use super::cut_cell::CellIndex;

/// Cells that hold items (regions, polygons), in order of row and column.
#[derive(Debug, Clone)]
pub(crate) struct CellRows {
    cells: Vec<CellIndex>,
    /// First item of each cell, and the number of items at the end.
    items: Vec<u32>,
    first_row: i64,
    /// First cell of each row from `first_row` on, and the number of cells at the end.
    row_start: Vec<u32>,
}

/// Which of the nine cells around a place, itself included, are among some cells.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Around(u16);

impl Around {
    /// Whether the cell `di` columns and `dj` rows away is, both -1 to 1.
    pub(crate) fn has(self, di: i64, dj: i64) -> bool {
        self.0 >> (4 + 3 * dj + di) & 1 != 0
    }
}

impl CellRows {
    /// - `cells`: the cell of each item, rising by row and column
    pub(crate) fn new(item_cells: impl Iterator<Item = CellIndex>) -> Self {
        let mut cells: Vec<CellIndex> = Vec::new();
        let mut items = Vec::new();
        let mut count = 0;
        for cell in item_cells {
            if cells.last() != Some(&cell) {
                cells.push(cell);
                items.push(count);
            }
            count += 1;
        }
        items.push(count);
        let first_row = cells.first().map_or(0, |c| c.1);
        let mut row_start = vec![0];
        for (index, cell) in cells.iter().enumerate() {
            row_start.resize((cell.1 - first_row) as usize + 1, index as u32);
        }
        row_start.push(cells.len() as u32);
        Self {
            cells,
            items,
            first_row,
            row_start,
        }
    }

    /// All cells in order.
    pub(crate) fn cells(&self) -> &[CellIndex] {
        &self.cells
    }

    /// Items of a cell given by its place in [`CellRows::cells`].
    pub(crate) fn items(&self, cell: usize) -> Range<usize> {
        self.items[cell] as usize..self.items[cell + 1] as usize
    }

    /// Place of a cell among all, if it is one of them.
    pub(crate) fn find(&self, cell: CellIndex) -> Option<usize> {
        let range = self.row_range(cell.1);
        let place = self.cells[range.clone()].binary_search_by_key(&cell.0, |c| c.0);
        place.ok().map(|k| range.start + k)
    }

    fn row_range(&self, row: i64) -> Range<usize> {
        let at = usize::try_from(row - self.first_row).unwrap_or(usize::MAX);
        match (
            self.row_start.get(at),
            self.row_start.get(at.saturating_add(1)),
        ) {
            (Some(&from), Some(&to)) => from as usize..to as usize,
            _ => 0..0,
        }
    }

    /// Place of the east and of the north neighbour of every cell, where they are among the cells.
    pub(crate) fn neighbours(&self) -> Vec<[Option<usize>; 2]> {
        let mut above = 0;
        self.cells
            .iter()
            .enumerate()
            .map(|(index, &(column, row))| {
                let wanted = (row + 1, column);
                while self.cells.get(above).is_some_and(|c| (c.1, c.0) < wanted) {
                    above += 1;
                }
                let is =
                    |place: usize, cell| (self.cells.get(place) == Some(&cell)).then_some(place);
                [
                    is(index + 1, (column + 1, row)),
                    is(above, (column, row + 1)),
                ]
            })
            .collect()
    }

    /// Columns of one row that are among the cells or have one of them around, rising.
    ///
    /// - `found`: is overwritten
    pub(crate) fn columns_around(&self, row: i64, found: &mut Vec<(i64, Around)>) {
        found.clear();
        let mut rows = [-1, 0, 1].map(|dj| &self.cells[self.row_range(row + dj)]);
        let mut column = i64::MIN / 2;
        loop {
            let mut around = 0;
            let mut next = i64::MAX;
            for (first_bit, cells) in [0, 3, 6].into_iter().zip(&mut rows) {
                while cells.first().is_some_and(|c| c.0 < column - 1) {
                    *cells = &cells[1..];
                }
                for cell in cells.iter().take(3) {
                    let step = cell.0 - column;
                    if step > 1 {
                        break;
                    }
                    around |= 1 << (first_bit + step + 1);
                }
                next = next.min(cells.first().map_or(i64::MAX, |c| c.0));
            }
            if around != 0 {
                found.push((column, Around(around)));
                column += 1;
            } else if next == i64::MAX {
                return;
            } else {
                column = next - 1;
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn neighbours_and_surroundings_are_those_of_a_search() {
        // Column and row of some cells, with a gap of rows and a repeated cell.
        let cells = [
            (3, -1),
            (4, -1),
            (4, -1),
            (9, -1),
            (4, 0),
            (10, 0),
            (2, 3),
            (3, 3),
        ];
        let rows = CellRows::new(cells.iter().copied());
        assert_eq!(rows.cells().len(), 7);
        assert_eq!(rows.items(1), 1..3);
        let has = |cell: CellIndex| cells.contains(&cell);
        for (&(i, j), found) in rows.cells().iter().zip(rows.neighbours()) {
            for (place, cell) in found.into_iter().zip([(i + 1, j), (i, j + 1)]) {
                assert_eq!(place.map(|k| rows.cells()[k]), has(cell).then_some(cell));
            }
        }
        for j in -3..6 {
            let mut found = Vec::new();
            rows.columns_around(j, &mut found);
            for i in -2..14 {
                assert_eq!(rows.find((i, j)).is_some(), has((i, j)));
                let around = found.iter().find(|f| f.0 == i).map(|f| f.1);
                for (di, dj) in (-1..=1).flat_map(|di| (-1..=1).map(move |dj| (di, dj))) {
                    let seen = around.is_some_and(|a| a.has(di, dj));
                    assert_eq!(seen, has((i + di, j + dj)), "{i} {j} {di} {dj}");
                }
            }
            assert!(found.windows(2).all(|pair| pair[0].0 < pair[1].0));
        }
    }
}
