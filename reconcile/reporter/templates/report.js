(function () {
  "use strict";
  function value(cell) {
    var text = cell.textContent.trim();
    var number = Number(text.replace(/\u2212/g, "-").replace(/^\+/, "").replace(/,(?=\d{3})/g, ""));
    return text === "" ? null : isNaN(number) ? text : number;
  }
  function compare(a, b) {
    if (a === null || b === null) { return (a === null) - (b === null); }
    if (typeof a === "number" && typeof b === "number") { return a - b; }
    return String(a).localeCompare(String(b), "en", { numeric: true });
  }
  function sorter(table, heading, column) {
    var button = document.createElement("button");
    button.type = "button";
    button.textContent = heading.textContent;
    heading.textContent = "";
    heading.appendChild(button);
    button.addEventListener("click", function () {
      var down = heading.getAttribute("aria-sort") === "ascending";
      table.querySelectorAll("th").forEach(function (th) { th.removeAttribute("aria-sort"); });
      heading.setAttribute("aria-sort", down ? "descending" : "ascending");
      var body = table.tBodies[0];
      var rows = Array.from(body.rows).map(function (row, i) { return [value(row.cells[column]), i, row]; });
      rows.sort(function (a, b) {
        if (a[0] === null || b[0] === null) { return compare(a[0], b[0]) || a[1] - b[1]; }
        return (down ? -1 : 1) * compare(a[0], b[0]) || a[1] - b[1];
      });
      rows.forEach(function (row) { body.appendChild(row[2]); });
    });
  }
  function filter(table) {
    var line = document.createElement("p");
    var label = document.createElement("label");
    var input = document.createElement("input");
    var count = document.createElement("output");
    var rows = Array.from(table.tBodies[0].rows);
    var texts = rows.map(function (row) { return Array.from(row.cells).map(function (c) { return c.textContent; }).join(" ").toLowerCase(); });
    line.className = "filter";
    input.type = "search";
    input.id = table.id + "-filter";
    label.htmlFor = input.id;
    label.textContent = "Rows that contain";
    count.htmlFor = input.id;
    function apply() {
      var words = input.value.toLowerCase().split(/\s+/).filter(Boolean);
      var shown = 0;
      rows.forEach(function (row, i) {
        var keep = words.every(function (word) { return texts[i].indexOf(word) >= 0; });
        row.hidden = !keep;
        shown += keep ? 1 : 0;
      });
      count.textContent = words.length ? shown + " of " + rows.length + " rows" : rows.length + " rows";
    }
    input.addEventListener("input", apply);
    line.append(label, input, count);
    table.parentNode.parentNode.insertBefore(line, table.parentNode);
    apply();
    return function () { if (input.value) { input.value = ""; apply(); } };
  }
  var clears = [];
  document.querySelectorAll("table[data-tool]").forEach(function (table) {
    table.querySelectorAll("thead th").forEach(function (heading, column) { sorter(table, heading, column); });
    clears.push([table, filter(table)]);
  });
  window.addEventListener("hashchange", function () {
    var target = document.getElementById(location.hash.slice(1));
    clears.forEach(function (pair) { if (target && pair[0].contains(target) && target.hidden) { pair[1](); target.scrollIntoView(); } });
  });
})();
