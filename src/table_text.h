// Results as text: CSV with units in the header, or JSON, an array of objects with the same names.
#pragma once

#include <string>
#include <variant>
#include <vector>

namespace unsoldered {

/// Empty for what does not exist, a number, or text.
using Cell = std::variant<std::monostate, double, std::string>;

struct Table {
  std::vector<std::string> columns;
  std::vector<std::vector<Cell>> rows;  // each as long as columns
};

/// RFC 4180 quoting, numbers %.9g, "-inf" for the level of no signal, nothing for an empty cell or a NaN.
std::string csv_text(const Table& table);

/// Empty cells and what is not finite are null.
std::string json_text(const Table& table);

/// Text on standard output. Throws CannotError when that cannot be written.
void print_text(const std::string& text);

/// The table in the form asked for, on standard output. Throws CannotError.
void print_table(const Table& table, bool json);

}  // namespace unsoldered
