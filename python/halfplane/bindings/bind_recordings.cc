// SPDX-License-Identifier: GPL-3.0-or-later
// Bindings of recordings, and of their judge.
#include "outside_word.h"
#include "topics.h"

#include "halfplane/link/judge.h"
#include "halfplane/link/log.h"
#include "halfplane/rates.h"

#include <pybind11/complex.h>
#include <pybind11/stl.h>

#include <optional>

namespace halfplane::python {
namespace {

using link::recording;

py::object text_or_none(const std::string& text)
{
    return text.empty() ? py::object(py::none()) : py::str(text);
}

py::object number_or_none(double value)
{
    return value == 0 ? py::object(py::none()) : py::float_(value);
}

py::array_t<std::complex<float>> read(recording& from, std::size_t count)
{
    count = static_cast<std::size_t>(std::min<std::uint64_t>(count, from.samples() - from.position()));
    py::array_t<std::complex<float>> samples(static_cast<py::ssize_t>(count));
    auto* out = samples.mutable_data();
    py::gil_scoped_release free;
    for (std::size_t done = 0; done < count;)
        done += from.read(out + done, count - done);
    return samples;
}

py::list captures_of(const recording& from)
{
    py::list out;
    for (const auto& each : from.captures()) {
        py::dict capture;
        capture["first"] = each.first;
        capture["gap"] = each.gap;
        if (each.frequency)
            capture["frequency"] = *each.frequency;
        if (each.datetime)
            capture["datetime"] = *each.datetime;
        out.append(capture);
    }
    return out;
}

py::dict judged(recording& from,
                const signal_set& set,
                const pattern& known,
                const std::string& target,
                std::uint64_t frame_symbols,
                double max_excluded,
                double confidence,
                const std::string& rule,
                std::uint64_t window,
                std::optional<double> input_es_n0_db,
                double input_es_n0_db_se,
                const std::string& log,
                const py::object& progress)
{
    link::judge_options options;
    options.watch.pattern = known.text();
    options.watch.rule = parse_detector(rule);
    options.watch.confidence = confidence;
    options.watch.window = window > 0 ? window : link::window_for(from.samples());
    options.watch.trial.target = target;
    options.watch.trial.frame_symbols = frame_symbols;
    options.watch.trial.max_excluded = max_excluded;
    if (input_es_n0_db)
        options.input = link::input_snr{*input_es_n0_db, input_es_n0_db_se, false};
    outside_word outside;
    options.progress = [&](std::uint64_t done) { return outside.goes_on(progress, done); };

    std::optional<link::report_log> lines;
    if (!log.empty()) {
        lines.emplace(log);
        if (!lines->last_error().empty())
            throw std::invalid_argument(lines->last_error());
        options.on_report = [&](const link::report& made, const nlohmann::json& settings) {
            auto line = made;
            line["settings"] = settings;
            lines->write(std::move(line));
        };
    }
    const auto result = [&] {
        py::gil_scoped_release free;
        return link::judge(from, set, known, std::move(options));
    }();
    py::dict out;
    out["report"] = result.last.dump();
    out["settings"] = result.settings.dump();
    out["complete"] = result.complete;
    out["interrupted"] = outside.interrupted;
    if (lines && lines->failed() > 0) {
        out["log_failed"] = lines->failed();
        out["log_error"] = lines->last_error();
    }
    return out;
}

} // namespace

void bind_recordings(py::module_& m)
{
    m.def("sample_formats", &link::sample_format::names, "The formats of samples that are read.");
    py::class_<recording>(m, "recording", R"(Samples on disk: SigMF, or a file of samples alone.

path: of the metadata, the data, or the name that both share. format: of a file without metadata, as cf32_le.
sample_rate: Hz, where the recording does not say it.)")
        .def(py::init<const std::string&, const std::string&, double>(),
             py::arg("path"),
             py::arg("format") = "",
             py::arg("sample_rate") = 0.0)
        .def_property_readonly("data_path", &recording::data_path)
        .def_property_readonly("format", [](const recording& r) { return r.format().name(); })
        .def_property_readonly(
            "sample_rate",
            [](const recording& r) { return number_or_none(r.sample_rate()); },
            "Hz; None where unknown.")
        .def_property_readonly("samples", &recording::samples, "Whole samples.")
        .def_property_readonly("position", &recording::position, "Samples read so far.")
        .def_property_readonly(
            "ignored_bytes", &recording::ignored_bytes, "Bytes at the end that make no whole sample.")
        .def_property_readonly("captures",
                               &captures_of,
                               "A dict each: first (sample), gap, and frequency, datetime where known.")
        .def_property_readonly(
            "sha512", &recording::sha512, "As the metadata says; not verified. None where not said.")
        .def_property_readonly(
            "set_text",
            [](const recording& r) {
                const auto& set = r.set();
                return text_or_none(set.is_null()     ? ""
                                    : set.is_string() ? set.get<std::string>()
                                                      : set.dump());
            },
            "halfplane:set: a name, or the JSON of a set file. None where not said.")
        .def_property_readonly(
            "pattern",
            [](const recording& r) { return text_or_none(r.pattern()); },
            "halfplane:pattern. None where not said.")
        .def("time_of",
             &recording::time_of,
             py::arg("sample"),
             "UTC of a sample, RFC 3339 in milliseconds; empty where unknown.")
        .def("read", &read, py::arg("count"), "The next samples, complex64; fewer at the end.");
    m.def("judge",
          &judged,
          py::arg("recording"),
          py::arg("set"),
          py::arg("pattern"),
          py::kw_only(),
          py::arg("target") = "",
          py::arg("frame_symbols") = 0,
          py::arg("max_excluded") = 1e-3,
          py::arg("confidence") = 0.95,
          py::arg("detector") = "automatic",
          py::arg("window") = 0,
          py::arg("input_es_n0_db") = py::none(),
          py::arg("input_es_n0_db_se") = 0.0,
          py::arg("log") = "",
          py::arg("progress") = py::none(),
          R"(Judges a recording with one sample a symbol by the objects of the live link.

target: "ser:1e-3", "ber:1e-5", "fer:1e-2" or empty; window: symbols a report, 0 for fifty reports at most; log:
file that each report is appended to. progress(samples) is called ten times a second at most; False stops, and so does
Ctrl-C: what was read is judged. Returns a dict: report and settings (JSON), complete, interrupted, and log_failed,
log_error where lines could not be written.)");
}

} // namespace halfplane::python
