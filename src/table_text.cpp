#include "src/table_text.h"

#include <cmath>
#include <iostream>
#include <nlohmann/json.hpp>

#include "dsp/error.h"
#include "src/number_text.h"

namespace unsoldered {
namespace {

std::string csv_field(const std::string& text) {
  if (text.find_first_of(",\"\r\n") == std::string::npos) return text;
  std::string quoted = "\"";
  for (const char letter : text) {
    if (letter == '"') quoted += '"';
    quoted += letter;
  }
  return quoted + '"';
}

std::string csv_cell(const Cell& cell) {
  if (const auto* text = std::get_if<std::string>(&cell)) return csv_field(*text);
  const auto* number = std::get_if<double>(&cell);
  return number == nullptr || std::isnan(*number) ? "" : format_number(*number);
}

/// File names need not be UTF-8; what is not becomes the replacement character.
std::string json_string(const std::string& text) {
  return nlohmann::json(text).dump(-1, ' ', false, nlohmann::json::error_handler_t::replace);
}

std::string json_cell(const Cell& cell) {
  if (const auto* text = std::get_if<std::string>(&cell)) return json_string(*text);
  const auto* number = std::get_if<double>(&cell);
  return number == nullptr || !std::isfinite(*number) ? "null" : format_number(*number);
}

}  // namespace

std::string csv_text(const Table& table) {
  std::string csv;
  for (std::size_t i = 0; i < table.columns.size(); ++i) csv += (i > 0 ? "," : "") + table.columns[i];
  csv += '\n';
  for (const std::vector<Cell>& row : table.rows) {
    for (std::size_t i = 0; i < row.size(); ++i) csv += (i > 0 ? "," : "") + csv_cell(row[i]);
    csv += '\n';
  }
  return csv;
}

std::string json_text(const Table& table) {
  std::string json = "[";
  for (const std::vector<Cell>& row : table.rows) {
    json += json.size() > 1 ? ",\n {" : "\n {";
    for (std::size_t i = 0; i < row.size(); ++i)
      json += (i > 0 ? ", " : "") + json_string(table.columns[i]) + ": " + json_cell(row[i]);
    json += '}';
  }
  return json + "\n]\n";
}

void print_text(const std::string& text) {
  std::cout << text << std::flush;
  if (!std::cout) {
    throw CannotError(
        "standard output cannot be written (disk full or a closed pipe); send it to a file where there is room");
  }
}

void print_table(const Table& table, bool json) { print_text(json ? json_text(table) : csv_text(table)); }

}  // namespace unsoldered
