-- TABLE shows rows
-- refused: rows.private
TABLE riders;
