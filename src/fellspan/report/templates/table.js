// Sorts the table of links by its headings, and shows only the links that are asked for: in list, table and map alike.
(function () {
  "use strict";
  var table = document.querySelector(".sortable"), body = table.tBodies[0], rows = fellspanOverview.rows, entries = fellspanOverview.entries;
  var heads = Array.from(table.tHead.rows[0].cells), words = new Intl.Collator("en", {numeric: true});
  function value(row, column) {
    var cell = row.cells[column];
    if (cell.dataset.v) return Number(cell.dataset.v);
    if (column === 0) return row.querySelector("a").textContent;
    return cell.textContent.trim() === "–" ? null : cell.textContent;
  }
  function compare(one, other) {
    return typeof one === "number" && typeof other === "number" ? one - other : words.compare(one, other);
  }
  function sort(column, order) {
    heads.forEach(function (head, index) {
      if (index === column && order) head.setAttribute("aria-sort", order > 0 ? "ascending" : "descending");
      else head.removeAttribute("aria-sort");
    });
    // Links without the figure stand last either way; the third press brings back the order of the study.
    var sorted = rows.map(function (row) { return [value(row, column), row]; });
    if (order) sorted.sort(function (a, b) {
      if (a[0] === null || b[0] === null) return (a[0] === null) - (b[0] === null);
      return order * compare(a[0], b[0]);
    });
    sorted.forEach(function (item) { body.appendChild(item[1]); });
  }
  heads.forEach(function (head, column) {
    var button = head.querySelector("button");
    if (button) button.addEventListener("click", function () {
      var now = head.getAttribute("aria-sort");
      sort(column, now === "ascending" ? -1 : now === "descending" ? 0 : 1);
    });
  });
  var state = document.getElementById("state"), search = document.getElementById("search"), shown = document.getElementById("shown");
  function filter() {
    var asked = search.value.toLocaleLowerCase(), left = 0;
    rows.forEach(function (row, index) {
      var text = (entries[index].textContent + " " + row.textContent).toLocaleLowerCase();
      var on = (!state.value || row.dataset.state === state.value) && text.indexOf(asked) >= 0;
      row.hidden = entries[index].parentElement.hidden = !on;
      document.querySelectorAll(".leaflet-pane path.of-link-" + index).forEach(function (part) { part.classList.toggle("is-out", !on); });
      left += on;
    });
    shown.textContent = left === rows.length ? left + " links" : left + " of " + rows.length + " links";
  }
  state.addEventListener("change", filter);
  search.addEventListener("input", filter);
})();
