/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/html.h"

#include <mho/version.h>
#include <mho/warning.h>

#include <string.h>

enum { REPORT_DIGITS = 3, FOLDED_MAX = 1000 /* rows */ };

const char *const *mho_limits(size_t *count)
{
  static const char *const limits[] = {
      "Only the pi system is in the model: no sigma paths, no direct coupling through space.",
      "One-electron levels: no correlation and no charging of the molecule by the current.",
      "The Fermi level of a real junction is not known. It is assumed, or fitted; every "
      "prediction is therefore also given over an alignment window around it.",
      "Trends and ratios come before absolute values: published conductances of one molecule "
      "differ by about 3 between groups for amines and by more than 10 for thiols and pyridyls "
      "(common practice).",
      "At a node of the pi system other paths carry the current: the model then predicts that "
      "the conductance is low, not how low.",
      "These are model predictions and no statement about the handling or safety of a compound: "
      "synthesis and measurement follow local rules and licensed practice."};
  *count = sizeof limits / sizeof *limits;
  return limits;
}

static const char style[] =
    "body{font:16px/1.5 'DejaVu Sans',Verdana,sans-serif;color:#1c2028;background:#fff;"
    "max-width:60rem;margin:2rem auto;padding:0 1rem}"
    "h1{font-size:1.5rem;line-height:1.3;border-left:.4rem solid #14213d;padding-left:.8rem}"
    "h2{font-size:1.15rem;margin:2.2rem 0 .6rem}"
    ".of{color:#5a6270;margin:0 0 .2rem}"
    "ul.answer{list-style:none;padding:0}"
    "ul.answer li{background:#eef0f3;margin:.4rem 0;padding:.5rem .8rem}"
    "div.wide{overflow-x:auto}"
    "table{border-collapse:collapse;font-size:.86rem;width:100%}"
    "th,td{padding:.35rem .6rem;text-align:right;border-bottom:1px solid #d8dce2;"
    "vertical-align:top}"
    "th{border-bottom:2px solid #5a6270;font-weight:600}"
    "td.number{white-space:nowrap}"
    "th:first-child,td:first-child,th.text,td.text{text-align:left}"
    "td.text{overflow-wrap:anywhere}"
    "td.node{color:#5a6270;font-style:italic}"
    "figure{margin:1rem 0}figure img{width:100%;height:auto}"
    ".portraits{display:flex;flex-wrap:wrap;gap:1rem}.portraits figure{margin:0;max-width:100%}"
    ".portraits img{width:auto;max-width:100%}.portraits figcaption{contain:inline-size}"
    "figcaption{color:#5a6270;font-size:.88rem}"
    "dt{font-weight:600;margin-top:.6rem}dd{margin:0 0 0 1rem}"
    "summary{cursor:pointer;color:#5a6270;font-size:.9rem}"
    "footer{color:#5a6270;font-size:.85rem;margin-top:3rem;border-top:1px solid #d8dce2}"
    "@media print{body{margin:0;max-width:none;font-size:11pt}h2{break-after:avoid}"
    "figure,tr{break-inside:avoid}}";

/* Columns as people write them. */
static const struct {
  const char *column, *heading;
} headings[] = {
    {"molecule", "molecule"},
    {"fermi_eV", "E<sub>F</sub> (eV)"},
    {"transmission", "T(E<sub>F</sub>)"},
    {"conductance_G0", "G (G<sub>0</sub>)"},
    {"conductance_S", "G (S)"},
    {"log10_G0", "log<sub>10</sub> G/G<sub>0</sub>"},
    {"window_low_log10_G0", "window 5 %"},
    {"window_high_log10_G0", "window 95 %"},
    {"computed_log10_G0", "computed log<sub>10</sub>"},
    {"computed_low", "low"},
    {"computed_high", "high"},
    {"measured_log10_G0", "measured log<sub>10</sub>"},
    {"measured_low", "low"},
    {"measured_high", "high"},
    {"ratio_computed", "ratio computed"},
    {"ratio_measured", "ratio measured"},
    {"deviation_decades", "deviation (decades)"},
    {"width_decades", "width (decades)"},
    {"gap_eV", "gap (eV)"},
    {"length_nm", "length (nm)"},
    {"top_probability", "top probability"},
    {"warnings", "warnings"},
    {"angle_deg", "angle (°)"},
    {"second_angle_deg", "second angle (°)"},
    {"energy_eV", "E − E<sub>F</sub> (eV)"},
    {"temperature_K", "T (K)"},
    {"mean_cos2", "mean cos²"},
    {"planar_G0", "flat (G<sub>0</sub>)"},
    {"motional_average_G0", "motional average (G<sub>0</sub>)"},
    {"frozen_average_G0", "frozen average (G<sub>0</sub>)"},
    {"green_per_eV", "Green's function (1/eV)"},
    {"node_eV", "nearest node (eV)"},
    {"overturning_shift_eV", "overturning shift (eV)"},
    {"change_decades", "change (decades)"},
    {"window_low", "window 5 %"},
    {"window_high", "window 95 %"},
    {"cross_conjugation", "cross-conjugation"},
    {"derivative_log10_G0", "derivative of log<sub>10</sub> G"},
    {"contribution_decades", "contribution (decades)"},
    {"current", "current (of T)"},
};

static const char *heading_of(const char *column)
{
  for (size_t i = 0; i < sizeof headings / sizeof *headings; i++)
    if (!strcmp(headings[i].column, column)) return headings[i].heading;
  return column;
}

static void write_cell(const mho_cell *cell, mho_buffer *buffer)
{
  switch (cell->kind) {
  case MHO_CELL_EMPTY: mho_buffer_add(buffer, "<td>–</td>"); return;
  case MHO_CELL_NODE: mho_buffer_add(buffer, "<td class=\"node\">node: no prediction</td>"); return;
  case MHO_CELL_INTEGER: mho_buffer_print(buffer, "<td>%ld</td>", cell->integer); return;
  case MHO_CELL_NUMBER:
    mho_buffer_add(buffer, "<td class=\"number\">");
    mho_buffer_number(buffer, REPORT_DIGITS, cell->number);
    mho_buffer_add(buffer, "</td>");
    return;
  case MHO_CELL_TEXT:
    mho_buffer_add(buffer, "<td class=\"text\">");
    mho_buffer_escape(buffer, cell->text);
    mho_buffer_add(buffer, "</td>");
    return;
  }
}

static void write_table(const mho_output *output, const char *name, mho_buffer *buffer)
{
  const mho_table *table = mho_output_find(output, name);
  if (!table) return;
  mho_buffer_add(buffer, "<div class=\"wide\"><table><thead><tr>");
  for (size_t c = 0; c < table->columns; c++)
    mho_buffer_print(buffer, "<th%s>%s</th>", c < 32 && table->left >> c & 1 ? " class=\"text\"" : "",
                     heading_of(table->column[c]));
  mho_buffer_add(buffer, "</tr></thead><tbody>\n");
  for (size_t i = 0; i < table->cells; i++) {
    if (i % table->columns == 0) mho_buffer_add(buffer, "<tr>");
    write_cell(&table->cell[i], buffer);
    if ((i + 1) % table->columns == 0) mho_buffer_add(buffer, "</tr>\n");
  }
  mho_buffer_add(buffer, "</tbody></table></div>\n");
}

static void write_base64(const mho_buffer *data, mho_buffer *buffer)
{
  static const char digit[] = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
  const unsigned char *s = (const unsigned char *)data->data;
  for (size_t i = 0; i < data->size; i += 3) {
    size_t left = data->size - i;
    unsigned long bits = (unsigned long)s[i] << 16 | (left > 1 ? (unsigned long)s[i + 1] << 8 : 0) |
                         (left > 2 ? s[i + 2] : 0);
    char out[4] = {digit[bits >> 18 & 63], digit[bits >> 12 & 63],
                   left > 1 ? digit[bits >> 6 & 63] : '=', left > 2 ? digit[bits & 63] : '='};
    mho_buffer_add_bytes(buffer, out, 4);
  }
}

static void write_figure(const mho_figure *figure, mho_buffer *buffer)
{
  mho_buffer_add(buffer, "<figure><img alt=\"");
  mho_buffer_escape(buffer, figure->caption);
  mho_buffer_add(buffer, "\" src=\"data:image/svg+xml;base64,");
  write_base64(&figure->svg, buffer);
  mho_buffer_add(buffer, "\"><figcaption>");
  mho_buffer_escape(buffer, figure->caption);
  mho_buffer_print(buffer, " <code>%s</code></figcaption></figure>\n", figure->file);
}

/* Plots in full width, then what is drawn on molecules, side by side. */
static void write_figures(const mho_report *report, const char *section, mho_buffer *buffer)
{
  for (int drawn = 0; drawn < 2; drawn++) {
    size_t count = 0;
    for (size_t i = 0; i < report->figures; i++) {
      const mho_figure *figure = &report->figure[i];
      if (strcmp(figure->section, section) || figure->drawn != (drawn == 1)) continue;
      if (drawn && count++ == 0) mho_buffer_add(buffer, "<div class=\"portraits\">\n");
      write_figure(figure, buffer);
    }
    if (count > 0) mho_buffer_add(buffer, "</div>\n");
  }
}

static void begin_section(mho_buffer *buffer, const char *id, const char *title)
{
  mho_buffer_print(buffer, "<section id=\"%s\"><h2>%s</h2>\n", id, title);
}

static void write_warnings(const mho_report *report, mho_buffer *buffer)
{
  const mho_output *output = report->output;
  begin_section(buffer, "warnings", "Warnings");
  if (output->warnings == 0) mho_buffer_add(buffer, "<p>None.</p>\n");
  else mho_buffer_add(buffer, "<dl>\n");
  for (size_t i = 0; i < output->warnings; i++) {
    mho_buffer_add(buffer, "<dt>");
    mho_buffer_escape(buffer, output->warning[i].molecule);
    mho_buffer_add(buffer, "</dt>\n");
    for (int k = 0; k < MHO_WARNING_COUNT; k++)
      if (output->warning[i].warnings & (1u << k))
        mho_buffer_print(buffer, "<dd><strong>%s</strong>: %s</dd>\n", mho_warning_word(k),
                         mho_warning_sentence(k));
  }
  mho_buffer_add(buffer, output->warnings ? "</dl></section>\n" : "</section>\n");
}

static void write_list(mho_buffer *buffer, const char *class_name, char *const *text,
                       size_t count)
{
  mho_buffer_print(buffer, "<ul%s%s%s>\n", class_name ? " class=\"" : "",
                   class_name ? class_name : "", class_name ? "\"" : "");
  for (size_t i = 0; i < count; i++) {
    mho_buffer_add(buffer, "<li>");
    mho_buffer_escape(buffer, text[i]);
    mho_buffer_add(buffer, "</li>\n");
  }
  mho_buffer_add(buffer, "</ul>\n");
}

static void write_traces(const mho_report *report, mho_buffer *buffer)
{
  if (!mho_output_find(report->output, "traces")) return;
  begin_section(buffer, "traces", "Measured traces");
  write_figures(report, "traces", buffer);
  mho_buffer_add(buffer, "<p>Peaks of the log histograms with 95 % intervals by bootstrap over "
                         "whole traces.</p>\n");
  write_table(report->output, "traces", buffer);
  mho_buffer_add(buffer, "</section>\n");
}

static void write_portraits(const mho_report *report, mho_buffer *buffer)
{
  begin_section(buffer, "molecules", "The molecules as they were understood");
  mho_buffer_add(buffer,
                 "<p>Bars marked L and R are the contacts, rings are linkers, bows are bonds that "
                 "turn, with their angle. Two dots: the site brings a pair of electrons. Dashed "
                 "bonds lie outside the π system.</p>\n<div class=\"portraits\">\n");
  for (size_t i = 0; i < report->portraits; i++) {
    mho_buffer_add(buffer, "<figure><img alt=\"drawing of ");
    mho_buffer_escape(buffer, report->portrait[i].name);
    mho_buffer_add(buffer, "\" src=\"data:image/svg+xml;base64,");
    write_base64(&report->portrait[i].svg, buffer);
    mho_buffer_add(buffer, "\"><figcaption>");
    mho_buffer_escape(buffer, report->portrait[i].name);
    mho_buffer_add(buffer, "</figcaption></figure>\n");
  }
  mho_buffer_add(buffer, "</div></section>\n");
}

/* A long table, to be opened. */
static void write_folded(const mho_output *output, const char *name, mho_buffer *buffer)
{
  const mho_table *table = mho_output_find(output, name);
  if (!table) return;
  size_t rows = mho_table_rows(table);
  if (rows > FOLDED_MAX) {
    mho_buffer_print(buffer, "<p class=\"of\">%zu rows are in <code>%s.csv</code>.</p>\n", rows, name);
    return;
  }
  mho_buffer_print(buffer, "<details><summary>%zu row%s, as in <code>%s.csv</code></summary>\n", rows,
                   rows == 1 ? "" : "s", name);
  write_table(output, name, buffer);
  mho_buffer_add(buffer, "</details>\n");
}

/* A stage that a study may ask for; `table` tells whether it did. */
static void write_stage(const mho_report *report, const char *id, const char *title,
                        const char *words, const char *table, const char *const *folded,
                        mho_buffer *buffer)
{
  if (!mho_output_find(report->output, table)) return;
  begin_section(buffer, id, title);
  mho_buffer_print(buffer, "<p>%s</p>\n", words);
  bool list = false;
  for (size_t i = 0; i < report->remarks; i++) {
    if (strcmp(report->remark[i].section, id)) continue;
    mho_buffer_add(buffer, list ? "<li>" : "<ul>\n<li>");
    mho_buffer_escape(buffer, report->remark[i].text);
    mho_buffer_add(buffer, "</li>\n");
    list = true;
  }
  if (list) mho_buffer_add(buffer, "</ul>\n");
  write_figures(report, id, buffer);
  for (; *folded; folded++) write_folded(report->output, *folded, buffer);
  mho_buffer_add(buffer, "</section>\n");
}

enum { SCREENING_ROWS_SHOWN = 30 };

static void write_screening(const mho_report *report, mho_buffer *buffer)
{
  const mho_table *table = mho_output_find(report->output, "screen");
  if (!table) return;
  begin_section(buffer, "screening", "Which of the list to make");
  mho_buffer_add(buffer,
                 "<p>Candidates by rank. Low and high are one standard deviation of the "
                 "parameters; the top probability is the chance to be among the first when all "
                 "err together.</p>\n");
  bool few = mho_table_rows(table) <= SCREENING_ROWS_SHOWN;
  (few ? write_table : write_folded)(report->output, "screen", buffer);
  write_folded(report->output, "failures", buffer);
  mho_buffer_add(buffer, "</section>\n");
}

static void write_levers(const mho_report *report, mho_buffer *buffer)
{
  static const char *const sensitivity[] = {"sensitivity", NULL};
  static const char *const twist[] = {"twist_average", "twist", "twist_map", "twist_plane", NULL};
  static const char *const interference[] = {"modify", "rules", "interference", NULL};
  write_stage(report, "sensitivity", "What decides it, and what to change",
              "Derivatives of log10 G at the Fermi level: where a donor or an acceptor, and where a "
              "twist, raises or lowers the conductance.", "sensitivity", sensitivity, buffer);
  write_stage(report, "twist", "How flat it must be",
              "Conductance against the angle of a bond, the Fermi level held where the molecule as "
              "given has it.", "twist", twist, buffer);
  write_stage(report, "interference", "Where the linkers should go",
              "T between every two sites that a linker may sit on, at the Fermi level: which pairs "
              "conduct, which are nodes, and how far the Fermi level may move before that turns.",
              "interference", interference, buffer);
  write_screening(report, buffer);
}

static void write_results(const mho_report *report, mho_buffer *buffer)
{
  static const char *const currents[] = {"currents", NULL};
  if (mho_output_find(report->output, "compare")) {
    begin_section(buffer, "comparison", "Measured against computed");
    write_figures(report, "comparison", buffer);
    mho_buffer_add(buffer,
                   "<p>Ratios are to the reference molecule; the deviation is the logarithm of "
                   "computed over measured ratio. Low and high are one standard deviation: of the "
                   "model's parameters, and of the measured spread.</p>\n");
    write_table(report->output, "compare", buffer);
    mho_buffer_add(buffer, "</section>\n");
  }
  write_traces(report, buffer);
  begin_section(buffer, "predictions", "Predicted conductance");
  write_table(report->output, "conductance", buffer);
  mho_buffer_add(buffer, "</section>\n");
  write_levers(report, buffer);
  begin_section(buffer, "transmission", "Transmission");
  if (report->without_gnuplot)
    mho_buffer_add(buffer, "<p>Figures are missing because gnuplot was not found; the curves are "
                           "in <code>transmission.csv</code>.</p>\n");
  write_figures(report, "transmission", buffer);
  write_folded(report->output, "orbitals", buffer);
  mho_buffer_add(buffer, "</section>\n");
  write_stage(report, "currents", "Where the current flows",
              "Currents through bonds at the Fermi level, of electrons that come from the left "
              "contact; what goes round a ring is marked in it.", "currents", currents, buffer);
}

mho_status mho_write_html(const mho_report *report, mho_buffer *buffer, mho_error *error)
{
  mho_buffer_add(buffer, "<!DOCTYPE html>\n<html lang=\"en\"><head><meta charset=\"utf-8\">"
                         "<meta name=\"viewport\" content=\"width=device-width\"><title>");
  mho_buffer_escape(buffer, report->title);
  mho_buffer_print(buffer, "</title><style>%s</style></head><body>\n", style);
  mho_buffer_add(buffer, "<section id=\"question\"><p class=\"of\">The question</p><h1>");
  mho_buffer_escape(buffer, report->title);
  mho_buffer_add(buffer, "</h1>\n");
  if (report->answers) write_list(buffer, "answer", report->answer, report->answers);
  mho_buffer_add(buffer, "</section>\n");
  write_portraits(report, buffer);
  write_results(report, buffer);
  write_warnings(report, buffer);
  begin_section(buffer, "assumptions", "What was assumed");
  write_list(buffer, NULL, report->output->note, report->output->notes);
  mho_buffer_add(buffer, "</section>\n");
  begin_section(buffer, "limits", "What the model does not know");
  size_t count;
  const char *const *limits = mho_limits(&count);
  mho_buffer_add(buffer, "<ul>\n");
  for (size_t i = 0; i < count; i++) mho_buffer_print(buffer, "<li>%s</li>\n", limits[i]);
  mho_buffer_print(buffer, "</ul></section>\n<footer><p>mholecule %s. All numbers of this page "
                           "stand in results.json and the CSV files beside it.</p></footer>\n"
                           "</body></html>\n",
                   mho_version());
  return mho_buffer_check(buffer, "report", error);
}
