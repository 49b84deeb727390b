"""What people call the columns of the tables: trade words in a few languages, by which other headers are recognised."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping

SYNONYMS: Mapping[str, tuple[str, ...]] = {
    "site": ("depot", "warehouse", "plant", "hub", "standort", "lager", "werk", "entrepot", "almacen", "magazzino"),
    "customer": ("client", "consignee", "ship to", "recipient", "kunde", "kundenname", "cliente", "klant", "klient"),
    "supplier": ("vendor", "source", "lieferant", "fournisseur", "proveedor", "fornitore", "leverancier", "dostawca"),
    "place": ("town", "city", "address", "ort", "stadt", "adresse", "ville", "ciudad", "citta", "miasto"),
    "country": ("land", "nation", "country code", "staat", "pays", "pais", "paese", "kraj"),
    "latitude": ("lat", "y", "breite", "breitengrad", "latitud", "latitudine"),
    "longitude": ("lon", "lng", "long", "x", "lange", "laenge", "langengrad", "laengengrad", "longitud", "longitudine"),
    "standing": ("status", "state", "in use", "stand", "statut", "estado"),
    "ruling": ("decision", "vorgabe", "must"),
    "opening_charge": ("investment", "opening cost", "set up cost", "investition", "investissement", "inversion"),
    "signing_charge": ("onboarding cost", "contract fee", "qualification cost"),
    "yearly_charge": (
        "annual cost", "fixed cost", "yearly cost", "rent", "fixkosten", "jahreskosten", "miete", "cout fixe",
        "coste fijo", "loyer",
    ),
    "closing_charge": ("closing cost", "closure cost", "severance", "schliessungskosten", "cout de fermeture"),
    "dropping_charge": ("exit fee", "termination cost", "cancellation fee"),
    "capacity": ("max volume", "maximum", "kapazitat", "kapazitaet", "capacite", "capacidad", "capacita"),
    "least_throughput": ("minimum volume", "min throughput", "mindestmenge"),
    "least_yearly": ("minimum order", "minimum volume", "take or pay", "mindestabnahme"),
    "handling_rate": ("handling cost", "variable cost", "cost per unit", "umschlagskosten", "handling"),
    "residual_value": ("salvage value", "resale value", "restwert", "valeur residuelle"),
    "demand": (
        "volume", "quantity", "qty", "tonnes", "tons", "annual demand", "annual volume", "sales volume", "menge",
        "jahresmenge", "bedarf", "absatz", "demande", "quantite", "cantidad", "quantita", "popyt",
    ),
    "reach_km": ("max distance", "service radius", "maximale entfernung", "radius"),
    "single_source": ("one origin", "single sourcing"),
    "unit_price": ("price", "purchase price", "preis", "einkaufspreis", "prix", "precio", "prezzo", "cena"),
    "size": ("option", "variant", "grosse", "groesse", "taille"),
    "good": ("product", "item", "article", "sku", "commodity", "material", "artikel", "produkt", "produit", "producto"),
    "weight_t": ("weight", "tonnes per unit", "gewicht", "poids", "peso"),
    "load": ("space", "pallets per unit", "volume per unit"),
    "origin": ("from", "start", "loading point", "von", "quelle", "de", "desde", "origine"),
    "destination": ("to", "end", "unloading point", "nach", "ziel", "vers", "hasta", "destino"),
    "leg": ("direction", "stage", "strecke"),
    "road_km": ("distance", "distance km", "km", "kilometres", "kilometers", "entfernung", "distancia", "distanza"),
    "unit_cost": ("freight", "freight cost", "rate", "cost", "transport cost", "fracht", "frachtkosten", "fret"),
    "barred": ("forbidden", "blocked", "excluded", "gesperrt", "interdit"),
    "rule": ("kind", "type", "regel"),
    "members": ("names", "sites", "mitglieder"),
    "number": ("count", "limit", "anzahl", "nombre"),
}  # fmt: skip
"""Without accents and in small letters, words parted by blanks; the columns' own names are not repeated."""

TABLE_SYNONYMS: Mapping[str, tuple[str, ...]] = {
    "sites": (
        "depots",
        "warehouses",
        "plants",
        "hubs",
        "locations",
        "standorte",
        "lager",
        "werke",
        "entrepots",
        "almacenes",
    ),
    "customers": ("clients", "consignees", "recipients", "ship to", "kunden", "kundenliste", "clientes", "klanten"),
    "suppliers": ("vendors", "sources", "lieferanten", "fournisseurs", "proveedores", "leveranciers"),
    "sizes": ("options", "grossen", "tailles"),
    "goods": ("products", "items", "articles", "artikel", "produkte", "produits", "productos"),
    "demands": ("volumes", "quantities", "forecast", "mengen", "bedarf", "bedarfe", "demandes"),
    "offers": ("prices", "quotes", "price list", "preise", "angebote", "prix"),
    "lanes": (
        "distances",
        "distance matrix",
        "freight",
        "routes",
        "entfernungen",
        "frachten",
        "strecken",
        "distancias",
    ),
    "rules": ("constraints", "regeln", "regles"),
}
"""What people call the tables, as above."""
