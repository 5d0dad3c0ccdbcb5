"""Small made-up things for tests, in an invented basin."""

from django.contrib.auth.models import User
from factory import Faker, LazyAttribute, Sequence, SubFactory
from factory.django import DjangoModelFactory

from labdata.models import Laboratory, Membership, Project, Role, Sample, SampleKind, Well

PASSWORD = "a long enough phrase"


class UserFactory(DjangoModelFactory):
    class Meta:
        model = User
        skip_postgeneration_save = True

    username = Sequence(lambda n: f"person{n}")
    first_name = Faker("first_name")

    @classmethod
    def _create(cls, model_class, *args, **kwargs):
        return model_class.objects.create_user(*args, password=kwargs.pop("password", PASSWORD), **kwargs)


class ProjectFactory(DjangoModelFactory):
    class Meta:
        model = Project

    slug = Sequence(lambda n: f"basin-{n}")
    name = LazyAttribute(lambda project: project.slug.title())


class MembershipFactory(DjangoModelFactory):
    class Meta:
        model = Membership

    project = SubFactory(ProjectFactory)
    user = SubFactory(UserFactory)
    role = Role.GEOCHEMIST


class WellFactory(DjangoModelFactory):
    class Meta:
        model = Well

    project = SubFactory(ProjectFactory)
    name = Sequence(lambda n: f"Quill {n}")
    name_key = LazyAttribute(lambda well: well.name.casefold())


class LaboratoryFactory(DjangoModelFactory):
    class Meta:
        model = Laboratory

    project = SubFactory(ProjectFactory)
    name = Sequence(lambda n: f"Laboratory {n}")


class SampleFactory(DjangoModelFactory):
    class Meta:
        model = Sample

    well = SubFactory(WellFactory)
    kind = SampleKind.CUTTINGS
    label = Sequence(lambda n: f"S-{n}")
    top_md_m = Sequence(lambda n: 2000.0 + 10 * n)
    base_md_m = LazyAttribute(lambda sample: sample.top_md_m + 10)
    match_key = LazyAttribute(lambda s: f"{s.kind}|{s.label}|{s.top_md_m:.3f}|{s.base_md_m:.3f}")
