"""Addresses of this room, under /p/SLUG/review/."""

from django.urls import URLPattern, URLResolver, path

from qc.review import note_views, outgoing, plain, views

urlpatterns: list[URLPattern | URLResolver] = [
    path("", views.review_sets, name="review_sets"),
    path("<int:pk>/", views.review, name="review"),
    path("<int:pk>/data/", views.review_data, name="review_data"),
    path("<int:pk>/flags/<int:flag>/", views.review_flag, name="review_flag"),
    path("<int:pk>/plain/", plain.review_plain, name="review_plain"),
    path("<int:pk>/signatures/<int:signature>.pdf", outgoing.review_record, name="review_record"),
    path("<int:pk>/drawing/", outgoing.review_drawing, name="review_drawing"),
    path("<int:pk>/notes/write/", note_views.review_note, name="review_note"),
    path("<int:pk>/notes/result/<int:result>/", note_views.review_result_note, name="review_result_note"),
    path("<int:pk>/notes/<int:note>.txt", note_views.review_question, name="review_question"),
    path("<int:pk>/notes/questions.txt", note_views.review_questions, name="review_questions"),
    path("<int:pk>/decide/", views.review_decide, name="review_decide"),
    path("<int:pk>/accept/", views.review_accept, name="review_accept"),
    path("<int:pk>/undo/", views.review_undo, name="review_undo"),
    path("<int:pk>/answer/", views.review_answer, name="review_answer"),
    path("<int:pk>/sign/", views.review_sign, name="review_sign"),
    path("<int:pk>/reopen/", views.review_reopen, name="review_reopen"),
]
