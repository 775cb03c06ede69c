"use strict";
(function () {
  function button(label, act) {
    var made = document.createElement("button");
    made.type = "button";
    made.textContent = label;
    made.addEventListener("click", function () { act(made); });
    return made;
  }
  function copied(made, label) {
    made.textContent = "copied";
    setTimeout(function () { made.textContent = label; }, 1500);
  }
  function copy(text, made) {
    var label = made.textContent;
    function byHand() {
      var area = document.createElement("textarea");
      area.value = text;
      document.body.appendChild(area);
      area.select();
      document.execCommand("copy");
      area.remove();
      made.focus();
      copied(made, label);
    }
    if (navigator.clipboard && window.isSecureContext) {
      navigator.clipboard.writeText(text).then(function () { copied(made, label); }, byHand);
    } else {
      byHand();
    }
  }
  function asText(table) {
    return Array.from(table.rows, function (row) {
      return Array.from(row.cells, function (cell) { return cell.textContent; }).join("\t");
    }).join("\n") + "\n";
  }
  document.querySelectorAll(".sheet").forEach(function (sheet) {
    var details = sheet.querySelector("details"), table = sheet.querySelector("table");
    sheet.insertBefore(button("copy as text", function (made) { copy(asText(table), made); }), details);
    sheet.insertBefore(button("copy as CSV", function (made) {
      copy(details.querySelector("pre").textContent, made);
    }), details);
  });
  document.querySelectorAll("figure").forEach(function (figure) {
    var frame = figure.querySelector(".frame");
    figure.insertBefore(button("larger", function (made) {
      made.textContent = figure.classList.toggle("large") ? "fit to page" : "larger";
      frame.tabIndex = figure.classList.contains("large") ? 0 : -1;
    }), figure.querySelector("figcaption"));
  });
  var root = document.documentElement;
  var dark = window.matchMedia("(prefers-color-scheme: dark)");
  var change = button("light or dark", function () {
    var now = root.dataset.paper || (dark.matches ? "dark" : "light");
    root.dataset.paper = now === "dark" ? "light" : "dark";
  });
  change.className = "paper-switch";
  document.querySelector("header").prepend(change);
}());
